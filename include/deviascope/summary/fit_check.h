// SPDX-License-Identifier: GPL-2.0-or-later
// chain -> SUMMARY -> figures
#pragma once

#include <Eigen/Core>
#include <array>
#include <cstdint>
#include <string>
#include <vector>

#include "deviascope/counts/count_map.h"
#include "deviascope/model/posterior.h"

namespace deviascope {

/// A pixel whose count lies far from what is expected there.
struct ResidualPixel {
    std::int64_t pixel = 0;  ///< RING
    Direction centre;        ///< in the job's frame
    std::int64_t count = 0;
    double expected = 0.0;
    double sigma = 0.0;  ///< level of the Poisson tail, two-sided; below 0: too few sources
};

/// Power of the residuals in one multipole of the cut sky.
struct ResidualPower {
    int multipole = 0;
    double chi2 = 0.0;         ///< of 2 l + 1 degrees of freedom where the counts are Poisson
    double probability = 0.0;  ///< of more
};

/// How the counts of one bin sit about the fitted model.
struct FitCheck {
    std::string survey, bin;
    double assumed_dispersion = 1.0;  ///< of the job
    double chi2 = 0.0;                ///< sum (n - lambda)^2 / lambda over the pixels (Pearson)
    double degrees = 0.0;        ///< pixels less the parameters that the bin's counts determine
    double dispersion = 0.0;     ///< chi2 / degrees; 1 for Poisson counts
    double dispersion_sd = 0.0;  ///< from the scatter of the pixels' own terms
    double probability = 0.0;    ///< of a larger chi2, were the dispersion the assumed one
    std::vector<ResidualPixel> largest;  ///< five, the furthest first
    std::array<ResidualPower, 3> power;  ///< l = 2, 3, 4
};

/// Posterior predictive checks (Rubin 1984, Ann. Stat. 12, 1151; from memory) at the posterior
/// mean: with thousands of pixels, what the parameters' own spread adds to the predicted
/// scatter is the number of parameters, and that is in `degrees`.
///
///   degrees      = pixels - 1 - tr(I_b Sigma), I_b the bin's expected information, its
///                  monopole eliminated, Sigma the posterior covariance
///   probability  of chi2 / phi: mean `degrees`, variance sum (2 + 1/lambda), third central
///                moment sum (8 + 22/lambda + 1/lambda^2) (of Poisson counts), shifted-gamma
///                form (Pearson's type III)
///   power        a_i = sum_p Y_i(n_p) (n_p - lambda_p), the Y made orthogonal, under
///                lambda, to what a monopole and a dipole can absorb; chi2 = a^T V^-1 a / phi
///                with the Poisson covariance V of the a
/// Pixels without exposure are not among the counts. A multipole that the footprint cannot hold
/// (V singular to 1e-10) has NaN.
/// @param mean        posterior means of all parameters
/// @param covariance  their posterior covariance; rows of redrawn monopoles are not read
/// @return  one for each of space.terms(). Threads: works on `threads`; same bits for any.
std::vector<FitCheck> check_fit(const Counts& counts,
                                const ParameterSpace& space,
                                const Eigen::VectorXd& mean,
                                const Eigen::MatrixXd& covariance,
                                int threads);

/// The same before any sampling, at the posterior's mode: mean and covariance of the parameters
/// from 1,000 draws of its Laplace approximation, stream (seed, laplace_draw; 1, draw, 0).
std::vector<FitCheck> check_fit_at_mode(const Counts& counts,
                                        const Posterior& posterior,
                                        std::uint64_t seed);

/// True where a bin's counts scatter more, or less, than its dispersion allows: less than one
/// time in a thousand.
bool is_over_dispersed(const FitCheck& check);
bool is_under_dispersed(const FitCheck& check);

}  // namespace deviascope
