// SPDX-License-Identifier: GPL-2.0-or-later
#include "deviascope/ensemble/diagnostics.h"

#include <algorithm>

#include "deviascope/core/parallel.h"
#include "ensemble/normal_scores.h"
#include "ensemble/score_tables.h"
#include "ensemble/series.h"
#include "ensemble/split_chains.h"

namespace deviascope {

namespace {

constexpr double unknown = std::numeric_limits<double>::quiet_NaN();

/// What the formulas need of all draws, before any middle draw is left out.
struct Middle {
    double median, q05, q95;
};

Middle middle_of(std::span<const Placed> sorted_draws) {
    return {quantile(sorted_draws, 0.5),
            quantile(sorted_draws, 0.05),
            quantile(sorted_draws, 0.95)};
}

/// z of the draws and z of |draw - median|, in the order of the draws.
struct Scores {
    LargeArray location, folded;
};

Scores scores_of(std::span<const Placed> sorted_draws,
                 double median,
                 const ScoreTables& tables) {
    const ScoreTable& table = tables.of(sorted_draws.size());
    return {scores_by_place(sorted_draws, table),
            scores_by_place(folded(sorted_draws, median), table)};
}

/// A folded series may be constant (two values about their median): then location decides.
double rhat_of(const Scores& scores, Eigen::Index n_chains) {
    return std::fmax(split_rhat({scores.location, n_chains}),
                     split_rhat({scores.folded, n_chains}));
}

double smaller_or_nan(double a, double b) {
    return EffectiveDraws{a, b}.smaller();
}

double effective_size_below(const Chains& chains, double threshold) {
    LargeArray is_below(chains.value.size());
    std::transform(
        chains.value.begin(), chains.value.end(), is_below.begin(), [&](double value) {
            return value <= threshold ? 1.0 : 0.0;
        });
    return split_effective_size({is_below, chains.n_chains});
}

/// Draws without the middle one of each chain, and their scores.
struct Split {
    Split(const Chains& chains, double median, const ScoreTables& tables)
        : kept(without_middle(chains)),
          n_chains(chains.n_chains),
          scores(scores_of(sorted(kept), median, tables)) {}
    Split(const Chains& even, Scores scores_of_all)
        : kept(even.value.begin(), even.value.end()),
          n_chains(even.n_chains),
          scores(std::move(scores_of_all)) {}

    double rhat() const { return rhat_of(scores, n_chains); }
    EffectiveDraws effective(const Middle& middle) const {
        const Chains chains{kept, n_chains};
        return {split_effective_size({scores.location, n_chains}),
                smaller_or_nan(effective_size_below(chains, middle.q05),
                               effective_size_below(chains, middle.q95))};
    }

    LargeArray kept;
    Eigen::Index n_chains;
    Scores scores;
};

bool is_usable(const Chains& chains) {
    return chains.n_chains > 0 && chains.n_draws() >= 4 &&
           std::none_of(chains.value.begin(), chains.value.end(), [](double value) {
               return std::isnan(value);
           });
}

std::vector<double> draw_by_draw(const Eigen::Ref<const Eigen::MatrixXd>& chains) {
    std::vector<double> value;
    value.reserve(static_cast<std::size_t>(chains.size()));
    for (Eigen::Index draw = 0; draw < chains.rows(); ++draw)
        for (Eigen::Index chain = 0; chain < chains.cols(); ++chain)
            value.push_back(chains(draw, chain));
    return value;
}

/// rows x replicates x walkers -> (rows x walkers) x replicates: one chain a replicate.
LargeArray chain_per_replicate(std::span<const double> series, const SeriesShape& shape) {
    const auto n_replicates = static_cast<std::size_t>(shape.n_replicates);
    const auto n_looked = static_cast<std::size_t>(shape.n_looked);
    LargeArray out(series.size());
    for (std::size_t at = 0; at < series.size(); ++at) {
        const std::size_t walker = at % n_looked;
        const std::size_t replicate = at / n_looked % n_replicates;
        const std::size_t row = at / n_looked / n_replicates;
        out[(row * n_looked + walker) * n_replicates + replicate] = series[at];
    }
    return out;
}

/// Ranks are of all draws together, so the walkers' scores serve the replicates too.
double replicate_rhat(const Scores& scores_of_all, const SeriesShape& shape) {
    return rhat_of({chain_per_replicate(scores_of_all.location, shape),
                    chain_per_replicate(scores_of_all.folded, shape)},
                   shape.n_replicates);
}

/// Where a replicate's chain has an odd number of draws, its middle one is left out first.
double replicate_rhat(std::span<const double> series,
                      double median,
                      const SeriesShape& shape,
                      const ScoreTables& tables) {
    const LargeArray value = chain_per_replicate(series, shape);
    return Split({value, shape.n_replicates}, median, tables).rhat();
}

}  // namespace

double rank_normalised_split_rhat(const Eigen::Ref<const Eigen::MatrixXd>& chains) {
    const std::vector<double> value = draw_by_draw(chains);
    const Chains all{value, chains.cols()};
    if (!is_usable(all)) return unknown;
    const double median = middle_of(sorted(value)).median;
    return Split(all, median, ScoreTables(value.size(), chains.cols())).rhat();
}

EffectiveDraws effective_draws(const Eigen::Ref<const Eigen::MatrixXd>& chains) {
    const std::vector<double> value = draw_by_draw(chains);
    const Chains all{value, chains.cols()};
    if (!is_usable(all)) return {};
    const Middle middle = middle_of(sorted(value));
    return Split(all, middle.median, ScoreTables(value.size(), chains.cols()))
        .effective(middle);
}

ScalarDiagnostics diagnose_series(const std::string& name,
                                  std::span<const double> series,
                                  const SeriesShape& shape,
                                  std::int64_t steps_per_row,
                                  const ScoreTables& tables) {
    ScalarDiagnostics out;
    out.name = name;
    const Chains chains{series, shape.n_chains()};
    if (!is_usable(chains)) return out;
    const PlacedDraws sorted_draws = sorted(series);
    const Middle middle = middle_of(sorted_draws);
    Scores scores = scores_of(sorted_draws, middle.median, tables);
    const bool replicates_are_even = chains.n_draws() * shape.n_looked % 2 == 0;
    out.replicate_rhat = replicates_are_even
                             ? replicate_rhat(scores, shape)
                             : replicate_rhat(series, middle.median, shape, tables);
    const Split split = chains.n_draws() % 2 == 0 ? Split(chains, std::move(scores))
                                                  : Split(chains, middle.median, tables);
    out.walker_rhat = split.rhat();
    const EffectiveDraws effective = split.effective(middle);
    const double scale =
        static_cast<double>(shape.n_walkers) / static_cast<double>(shape.n_looked);
    out.bulk = scale * effective.bulk;
    out.tail = scale * effective.tail;
    out.autocorrelation_steps = static_cast<double>(steps_per_row) *
                                static_cast<double>(series.size()) / effective.bulk;
    return out;
}

ScalarDiagnostics diagnose(const MonitoredScalar& scalar,
                           const Draws& draws,
                           std::int64_t steps_per_row) {
    return diagnose(std::vector<MonitoredScalar>{scalar}, draws, steps_per_row, 1).front();
}

std::vector<ScalarDiagnostics> diagnose(const std::vector<MonitoredScalar>& scalars,
                                        const Draws& draws,
                                        std::int64_t steps_per_row,
                                        int threads) {
    const SeriesShape shape = series_shape(draws.n_replicates, draws.n_walkers);
    const ScoreTables tables(draws.n_rows, shape);
    std::vector<ScalarDiagnostics> out(scalars.size());
    parallel_for(scalars.size(), threads, [&](std::size_t index) {
        LargeArray series;
        append_series(scalars[index], draws, 0, draws.n_rows, series);
        out[index] = diagnose_series(scalars[index].name, series, shape, steps_per_row, tables);
    });
    return out;
}

}  // namespace deviascope
