// SPDX-License-Identifier: GPL-2.0-or-later
// ENSEMBLE, inside: looks at the stored rows
#pragma once

#include <cstdint>
#include <limits>
#include <vector>

#include "deviascope/core/large_array.h"
#include "deviascope/ensemble/draws.h"
#include "deviascope/ensemble/monitored.h"
#include "ensemble/series.h"

namespace deviascope {

/// Step of a look: 128, 192, 256, 384, 512 … for look = 0, 1, 2 …
std::int64_t step_of_look(std::int64_t look);

/// What every scalar must reach.
struct LookRule {
    double walker_rhat_below;
    double replicate_rhat_below;
    double effective_draws_at_least;
};
/// The warm-up ends when its later half agrees this well.
inline constexpr LookRule warm_up_rule{1.10, 1.05, 0.0};
/// The run stops at this; walkers get 1.05 because their series are 10 to 20 tau long.
LookRule stopping_rule(double effective_draws);
/// A look with fewer stored rows does not stop the run.
inline constexpr Eigen::Index fewest_rows_to_stop = 8;

/// What a look found among the scalars it tested (all of them if it passed).
struct LookResult {
    bool passed = false;
    double worst_rhat = std::numeric_limits<double>::quiet_NaN();
    double fewest_effective_draws = std::numeric_limits<double>::quiet_NaN();
    double longest_autocorrelation_steps = std::numeric_limits<double>::quiet_NaN();
};

/// The watched values of the stored rows, one growing series a scalar.
class WatchedSeries {
  public:
    WatchedSeries(std::vector<MonitoredScalar> scalars,
                  Eigen::Index n_replicates,
                  Eigen::Index n_walkers);

    void append(const Draws& draws, Eigen::Index first_row, Eigen::Index last_row, int threads);

    Eigen::Index n_rows() const { return n_rows_; }
    std::size_t n_scalars() const { return scalars_.size(); }
    const std::vector<MonitoredScalar>& scalars() const { return scalars_; }
    const SeriesShape& shape() const { return shape_; }
    const LargeArray& series(std::size_t scalar) const { return series_[scalar]; }

  private:
    std::vector<MonitoredScalar> scalars_;
    SeriesShape shape_;
    Eigen::Index n_rows_ = 0;
    std::vector<LargeArray> series_;
};

/// Looks at series; tests first the scalar that failed last and ends at the first failure.
class Watch {
  public:
    explicit Watch(int threads) : threads_(threads) {}

    /// Scalars that never change (a vector along an axis has such components) are left out.
    LookResult look(const WatchedSeries& watched,
                    std::int64_t steps_per_row,
                    const LookRule& rule);
    /// The same without the early end: `longest_autocorrelation_steps` is over all scalars.
    LookResult look_at_all(const WatchedSeries& watched,
                           std::int64_t steps_per_row,
                           const LookRule& rule);

  private:
    int threads_;
    std::size_t failed_last_ = 0;
};

}  // namespace deviascope
