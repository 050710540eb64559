// SPDX-License-Identifier: GPL-2.0-or-later
// chain -> SUMMARY -> figures
#pragma once

#include <Eigen/Core>
#include <cstdint>
#include <limits>
#include <optional>
#include <span>
#include <vector>

#include "deviascope/core/target.h"
#include "deviascope/ensemble/draws.h"
#include "deviascope/model/parameter_space.h"

namespace deviascope {

/// The natural logarithm of an evidence (or of a ratio of two) and the standard error of it.
/// Both NaN where there is none.
struct LogEvidence {
    double value = std::numeric_limits<double>::quiet_NaN();
    double error = std::numeric_limits<double>::quiet_NaN();
};

/// The fixed point of the bridge
///   Z = mean_2[ l / (s1 l + s2 Z) ] / mean_1[ 1 / (s1 l + s2 Z) ],  l = q / g,
/// set 1 drawn from the density q / Z, set 2 from the normalised g; ln Z.
/// Source: Meng & Wong 1996, Stat. Sinica 6, 831 (their optimal bridge).
/// @param posterior_ratios  ln(q / g) at the points of set 1
/// @param proposal_ratios   ln(q / g) at those of set 2; -inf where q = 0
/// @param posterior_share   s1; s2 = 1 - s1
/// @return NaN where a set is empty or every point of set 2 has q = 0
double bridge(std::span<const double> posterior_ratios,
              std::span<const double> proposal_ratios,
              double posterior_share);

/// The stored draws of a run as the sampler's coordinates.
struct CoordinateDraws {
    Eigen::Index n_rows = 0, n_replicates = 0, n_walkers = 0;
    Eigen::MatrixXd coordinates;    ///< n_coordinates x draws, (row, replicate, walker) order
    Eigen::VectorXd log_posterior;  ///< draws

    Eigen::Index size() const { return log_posterior.size(); }
};
/// Errors: InternalError where the draws have other parameters than the space.
CoordinateDraws coordinate_draws(const ParameterSpace& space, const Draws& draws);

struct EvidenceOptions {
    std::uint64_t seed = 0;
    int threads = 1;  ///< never changes a bit of the result
    /// Draws from the proposal of bridge and importance sampling, each; at least 100.
    std::int64_t proposal_draws = 10000;
};

/// ln of the evidence: the integral of prior times likelihood, the latter relative to the
/// isotropic sky. A constant that improper monopole priors leave open is the same for all
/// hypotheses about the same counts.
struct Evidence {
    LogEvidence bridge;
    LogEvidence importance;
    /// Importance draws that count: (sum w)^2 / sum w^2 (Kish 1965). Below 100 the estimate is
    /// withheld.
    double importance_draws = 0.0;
};

/// Bridge sampling: proposal the mixture of the independence kernel about the draws' own mean
/// and covariance, fitted to one half of the replicates and used on the other, both ways round,
/// and averaged in ln Z (Overstall & Forster 2010, Comput. Stat. Data Anal. 54, 3269, from
/// memory, for apart the two halves). Error: Fruehwirth-Schnatter 2004, Econometrics J. 7, 143,
/// from memory, with the effective number of draws in place of the spectral density.
///
/// Importance sampling: the same mixture about the target's own approximation, no draw of the
/// chain used. A target without coordinates has its one value, exactly.
/// Threads: main thread; works on `options.threads`. Same bits for any number.
/// Errors: InternalError without draws.
Evidence evidence_of(const Target& target,
                     const CoordinateDraws& draws,
                     const EvidenceOptions& options);

/// Where a nested model holds some coordinates of the model around it: a point for each draw.
struct TestedPoints {
    std::vector<Eigen::Index> coordinate;  ///< n_tested, of the wide model
    Eigen::MatrixXd at;                    ///< n_tested x draws
    Eigen::VectorXd log_density;  ///< of their prior under the wide model, at each; finite
};

/// Points of a model whose vectors have other priors than in the one around it: drawn from
/// the narrow priors, a fresh draw for each draw of the chain. Empty where the models are not
/// nested so: other vectors, the same priors, a vector fixed in the wide model, a narrow prior
/// that reaches beyond the wide one.
std::optional<TestedPoints> tested_points(const ParameterSpace& wide,
                                          const ParameterSpace& narrow,
                                          Eigen::Index n_draws,
                                          std::uint64_t seed);

/// ln(Z0 / Z1) of a model 0 nested in model 1: the same but for some coordinates, delta, which
/// under 0 have points or a narrower density. With psi the rest,
///   Z0 / Z1 = E_0[ p(delta | y, 1) / p(delta | 1) ],  delta from its prior under 0
/// (Dickey 1971, Ann. Math. Stat. 42, 204, for a point; Verdinelli & Wasserman 1995, J. Am.
/// Stat. Assoc. 90, 614, for a density; both from memory). The posterior density of delta at a
/// point is the mean, over draws (d, psi) of model 1, of
///   w(d) q(delta, psi + A (delta - d)) / q(d, psi),
/// A the draws' regression of psi on delta, w a normal density about their mean: a form of Chen
/// 1994, J. Am. Stat. Assoc. 89, 818 (from memory), derived in DEVELOPERS.md; a constant for a
/// Gaussian posterior, however far delta lies from the draws.
/// Withheld (NaN) where fewer than 100 draws carry it.
/// @param wide  model 1, whose draws these are
LogEvidence savage_dickey(const Target& wide,
                          const CoordinateDraws& draws,
                          const TestedPoints& points,
                          const EvidenceOptions& options);

}  // namespace deviascope
