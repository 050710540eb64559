// SPDX-License-Identifier: GPL-2.0-or-later
// model -> ENSEMBLE -> chain
#pragma once

#include <Eigen/Core>

#include "deviascope/ensemble/draws.h"
#include "deviascope/ensemble/monitored.h"

namespace deviascope {

/// Rank-normalised split R-hat of chains (draws x chains): the larger of location and folded.
/// NaN with fewer than 4 draws; a constant series gives NaN.
/// Source: Vehtari, Gelman, Simpson, Carpenter & Buerkner 2021, Bayesian Analysis 16, 667.
double rank_normalised_split_rhat(const Eigen::Ref<const Eigen::MatrixXd>& chains);

/// Bulk, tail and both effective sample sizes (same source); autocorrelations averaged over
/// chains, Geyer's initial monotone sequence.
struct EffectiveDraws {
    double bulk = 0.0, tail = 0.0;
    double smaller() const { return bulk < tail ? bulk : tail; }
};
EffectiveDraws effective_draws(const Eigen::Ref<const Eigen::MatrixXd>& chains);

/// Convergence numbers of one scalar, as design section 5 defines them.
struct ScalarDiagnostics {
    std::string name;
    double walker_rhat = 0.0;       ///< over the replicate x walker series
    double replicate_rhat = 0.0;    ///< over one series a replicate, in (row, walker) order
    double bulk = 0.0, tail = 0.0;  ///< scaled by walkers / walkers looked at
    double autocorrelation_steps = 0.0;  ///< tau, in steps
};

/// Diagnostics use the first min(walkers, this many) of each replicate.
inline constexpr Eigen::Index walkers_looked_at = 32;

/// @param steps_per_row  store_every (or the spacing of a warm-up buffer)
ScalarDiagnostics diagnose(const MonitoredScalar& scalar,
                           const Draws& draws,
                           std::int64_t steps_per_row);

}  // namespace deviascope
