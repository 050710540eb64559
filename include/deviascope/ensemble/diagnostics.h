// SPDX-License-Identifier: GPL-2.0-or-later
// model -> ENSEMBLE -> chain
#pragma once

#include <Eigen/Core>
#include <cmath>
#include <limits>
#include <string>
#include <vector>

#include "deviascope/ensemble/draws.h"
#include "deviascope/ensemble/monitored.h"

namespace deviascope {

/// Rank-normalised split R-hat of chains (draws x chains): the larger of location and folded.
///
///   each chain is split in half (odd length: without its middle draw), N draws a half;
///   z = Phi^-1((r - 3/8) / (S + 1/4)), r the average rank among all S draws;
///   R-hat = sqrt( ((N-1)/N W + B/N) / W ),  W mean variance within, B = N var(means);
///   the larger of z of the draws and z of |draw - median|
///
/// Domain: NaN with fewer than 4 draws a chain, for a constant series and where a draw is NaN;
/// infinite where the halves are constant but unlike.
/// Threads: pure.
/// Source: Vehtari, Gelman, Simpson, Carpenter & Buerkner 2021, Bayesian Analysis 16, 667.
double rank_normalised_split_rhat(const Eigen::Ref<const Eigen::MatrixXd>& chains);

/// Bulk, tail and both effective sample sizes; autocorrelations averaged over chains, Geyer's
/// initial monotone sequence.
///
///   rho_t = 1 - (W - mean over chains of acov_t) / var+,  acov with divisor N,
///   var+ = (N-1)/N W + B/N
///   pairs P_k = rho_2k + rho_2k+1, as long as positive, none larger than the one before
///   tau = max(-1 + 2 sum_k P_k, 1/log10 S),  effective size = S / tau
///   bulk: of z as above; tail: the smaller of I(x <= q05) and I(x <= q95), type-7 quantiles
///
/// Domain, threads and source: as for R-hat. Starts pessimistic.
struct EffectiveDraws {
    double bulk = std::numeric_limits<double>::quiet_NaN();
    double tail = std::numeric_limits<double>::quiet_NaN();
    /// The smaller of the two; NaN where either is.
    double smaller() const { return std::isnan(bulk) || bulk < tail ? bulk : tail; }
};
EffectiveDraws effective_draws(const Eigen::Ref<const Eigen::MatrixXd>& chains);

/// Convergence numbers of one scalar (DEVELOPERS.md, "Warm-up, looks and the end"). All NaN
/// where the scalar is constant or has fewer than 4 rows.
struct ScalarDiagnostics {
    static constexpr double unknown = std::numeric_limits<double>::quiet_NaN();
    std::string name;
    double walker_rhat = unknown;     ///< over the replicate x walker series
    double replicate_rhat = unknown;  ///< over one series a replicate, in (row, walker) order
    double bulk = unknown, tail = unknown;  ///< scaled by walkers / walkers looked at
    /// tau = steps per row x rows x replicates x walkers / bulk, in steps.
    double autocorrelation_steps = unknown;

    /// The larger R-hat; NaN where either is.
    double worst_rhat() const {
        return std::isnan(walker_rhat) || walker_rhat > replicate_rhat ? walker_rhat
                                                                       : replicate_rhat;
    }
    /// The smaller of bulk and tail; NaN where either is.
    double effective_draws() const { return EffectiveDraws{bulk, tail}.smaller(); }
};

/// Diagnostics use the first min(walkers, this many) of each replicate.
inline constexpr Eigen::Index walkers_looked_at = 32;

/// @param steps_per_row  store_every (or the spacing of a warm-up buffer)
/// Threads: pure.
ScalarDiagnostics diagnose(const MonitoredScalar& scalar,
                           const Draws& draws,
                           std::int64_t steps_per_row);

/// The same for several scalars, in their order; shares what they have in common.
std::vector<ScalarDiagnostics> diagnose(const std::vector<MonitoredScalar>& scalars,
                                        const Draws& draws,
                                        std::int64_t steps_per_row,
                                        int threads);

}  // namespace deviascope
