// SPDX-License-Identifier: GPL-2.0-or-later
#include "ensemble/score_tables.h"

#include <algorithm>

#include "deviascope/core/error.h"

namespace deviascope {

ScoreTables::ScoreTables(std::size_t n_draws, Eigen::Index n_chains) {
    add_split(n_draws, n_chains);
}

ScoreTables::ScoreTables(Eigen::Index n_rows, const SeriesShape& shape) {
    const auto n_draws = static_cast<std::size_t>(n_rows * shape.n_chains());
    add(n_draws);
    add_split(n_draws, shape.n_chains());
    add_split(n_draws, shape.n_replicates);
}

const ScoreTable& ScoreTables::of(std::size_t n_draws) const {
    const auto found = std::find_if(tables_.begin(), tables_.end(), [&](const auto& table) {
        return table.n_draws() == n_draws;
    });
    ensure(found != tables_.end(), "the score table was made beforehand");
    return *found;
}

void ScoreTables::add(std::size_t n_draws) {
    const bool have = std::any_of(tables_.begin(), tables_.end(), [&](const auto& table) {
        return table.n_draws() == n_draws;
    });
    if (!have) tables_.emplace_back(n_draws);
}

void ScoreTables::add_split(std::size_t n_draws, Eigen::Index n_chains) {
    const auto n = static_cast<std::size_t>(n_chains);
    const bool is_odd = n > 0 && n_draws / n % 2 == 1;
    add(is_odd ? n_draws - n : n_draws);
}

}  // namespace deviascope
