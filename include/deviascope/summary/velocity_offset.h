// SPDX-License-Identifier: GPL-2.0-or-later
// chain -> SUMMARY -> figures
#pragma once

#include <Eigen/Core>
#include <cstdint>
#include <limits>

#include "deviascope/model/vector_prior.h"
#include "deviascope/summary/interval.h"

namespace deviascope {

/// How far a posterior of the velocity lies from a velocity measured elsewhere (a Gaussian in
/// the vector, same frame, units of c). NaN where undefined.
struct VelocityOffset {
    static constexpr double undefined = std::numeric_limits<double>::quiet_NaN();

    Eigen::Vector3d difference = Eigen::Vector3d::Constant(undefined);  ///< of the means
    double chi2 = undefined;                ///< difference^T (C1 + C2)^-1 difference
    double probability = undefined;         ///< of more, with 3 degrees of freedom
    double sigma = undefined;               ///< the same as a two-sided level
    ScalarEstimate angle_deg, speed_ratio;  ///< of draws against draws from the reference
    /// The same question without a Gaussian: the probability content of the differences that
    /// are more likely than none (Raveri & Doux 2021, Phys. Rev. D 104, 043504), one minus it.
    double shift_probability = undefined;
    double shift_sigma = undefined;
    /// True where fewer than ten draws lie beyond: the level is then a lower limit.
    bool shift_is_limit = false;
};

/// @param velocity         3 x draws
/// @param effective_draws  for the width of the density estimate; brought into 1 … draws
/// @param reference        its draws are keyed by (seed, reference_draw; 0, draw, 0)
/// The density of differences is a sum of Gaussian kernels in whitened coordinates, width
/// (4 / (5 n))^(1/7) of their spread (Silverman 1986, section 4.3), over at most 5,000 draws;
/// smoothing widens a Gaussian's level lines without changing what they hold.
/// Threads: works on `threads`; same bits for any number. Errors: InternalError without draws.
/// Undefined chi2 and shift where the velocity's covariance is singular (an axis, a fixed one).
VelocityOffset offset_from(const Eigen::Matrix3Xd& velocity,
                           double effective_draws,
                           const GaussianPrior& reference,
                           std::uint64_t seed,
                           int threads);

/// chi2, probability and sigma of a difference of two Gaussian 3-vectors.
struct GaussianDifference {
    double chi2 = VelocityOffset::undefined;
    double probability = VelocityOffset::undefined;
    double sigma = VelocityOffset::undefined;
};
/// @param covariance  of the difference: C1 + C2. All NaN where it is not positive definite.
GaussianDifference difference_of(const Eigen::Vector3d& difference,
                                 const Eigen::Matrix3d& covariance);

}  // namespace deviascope
