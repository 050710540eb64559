// SPDX-License-Identifier: GPL-2.0-or-later
#include "ensemble/looks.h"

#include <algorithm>
#include <cmath>
#include <numeric>
#include <span>

#include "deviascope/core/parallel.h"
#include "ensemble/score_tables.h"

namespace deviascope {

namespace {

/// Nothing can be said without rows.
bool is_constant(std::span<const double> series) {
    return !series.empty() && std::all_of(series.begin(), series.end(), [&](double value) {
        return value == series.front();
    });
}

bool passes(const ScalarDiagnostics& found, const LookRule& rule) {
    return found.walker_rhat < rule.walker_rhat_below &&
           found.replicate_rhat < rule.replicate_rhat_below &&
           found.effective_draws() >= rule.effective_draws_at_least;
}

/// Numbers that are not known (NaN) leave the extremes as they are.
void note(LookResult& result, const ScalarDiagnostics& found) {
    result.worst_rhat = std::fmax(result.worst_rhat, found.worst_rhat());
    result.fewest_effective_draws =
        std::fmin(result.fewest_effective_draws, found.effective_draws());
    result.longest_autocorrelation_steps =
        std::fmax(result.longest_autocorrelation_steps, found.autocorrelation_steps);
}

/// Diagnoses scalars, a few at a time on as many threads, in the order asked for.
class Examination {
  public:
    Examination(const WatchedSeries& watched, std::int64_t steps_per_row, int threads)
        : watched_(watched),
          steps_per_row_(steps_per_row),
          threads_(threads),
          tables_(watched.n_rows(), watched.shape()) {}

    std::vector<ScalarDiagnostics> of(const std::vector<std::size_t>& scalars) const {
        std::vector<ScalarDiagnostics> found(scalars.size());
        parallel_for(scalars.size(), threads_, [&](std::size_t index) {
            const std::size_t scalar = scalars[index];
            found[index] = diagnose_series(watched_.scalars()[scalar].name,
                                           watched_.series(scalar),
                                           watched_.shape(),
                                           steps_per_row_,
                                           tables_);
        });
        return found;
    }

  private:
    const WatchedSeries& watched_;
    std::int64_t steps_per_row_;
    int threads_;
    ScoreTables tables_;
};

/// Scalars that are not constant, the one named first.
std::vector<std::size_t> to_test(const WatchedSeries& watched, std::size_t first) {
    std::vector<std::size_t> order(watched.n_scalars());
    std::iota(order.begin(), order.end(), std::size_t{0});
    if (first < order.size())
        std::rotate(order.begin(),
                    order.begin() + static_cast<std::ptrdiff_t>(first),
                    order.begin() + static_cast<std::ptrdiff_t>(first) + 1);
    std::erase_if(order,
                  [&](std::size_t scalar) { return is_constant(watched.series(scalar)); });
    return order;
}

}  // namespace

std::int64_t step_of_look(std::int64_t look) {
    const std::int64_t first = look % 2 == 0 ? 128 : 192;
    return first << (look / 2);
}

LookRule stopping_rule(double effective_draws) {
    return {1.05, 1.01, effective_draws};
}

WatchedSeries::WatchedSeries(std::vector<MonitoredScalar> scalars,
                             Eigen::Index n_replicates,
                             Eigen::Index n_walkers)
    : scalars_(std::move(scalars)),
      shape_(series_shape(n_replicates, n_walkers)),
      series_(scalars_.size()) {}

void WatchedSeries::append(const Draws& draws,
                           Eigen::Index first_row,
                           Eigen::Index last_row,
                           int threads) {
    parallel_for(scalars_.size(), threads, [&](std::size_t scalar) {
        append_series(scalars_[scalar], draws, first_row, last_row, series_[scalar]);
    });
    n_rows_ += last_row - first_row;
}

LookResult Watch::look(const WatchedSeries& watched,
                       std::int64_t steps_per_row,
                       const LookRule& rule) {
    const std::vector<std::size_t> order = to_test(watched, failed_last_);
    const Examination examination(watched, steps_per_row, threads_);
    LookResult result;
    // The one that failed last goes alone: most looks end with it.
    std::size_t batch = 1;
    for (std::size_t first = 0; first < order.size(); first += batch) {
        if (first > 0) batch = static_cast<std::size_t>(threads_);
        const auto begin = order.begin() + static_cast<std::ptrdiff_t>(first);
        const auto size = std::min(batch, order.size() - first);
        const std::vector<std::size_t> some(begin, begin + static_cast<std::ptrdiff_t>(size));
        const std::vector<ScalarDiagnostics> found = examination.of(some);
        for (const ScalarDiagnostics& one : found) note(result, one);
        for (std::size_t index = 0; index < size; ++index) {
            if (passes(found[index], rule)) continue;
            failed_last_ = some[index];
            return result;
        }
    }
    result.passed = true;
    return result;
}

LookResult Watch::look_at_all(const WatchedSeries& watched,
                              std::int64_t steps_per_row,
                              const LookRule& rule) {
    LookResult result;
    const std::vector<std::size_t> order = to_test(watched, failed_last_);
    const std::vector<ScalarDiagnostics> found =
        Examination(watched, steps_per_row, threads_).of(order);
    for (const ScalarDiagnostics& one : found) note(result, one);
    result.passed = std::all_of(
        found.begin(), found.end(), [&](const auto& one) { return passes(one, rule); });
    return result;
}

}  // namespace deviascope
