// SPDX-License-Identifier: GPL-2.0-or-later
#include "ensemble/normal_scores.h"

#include <algorithm>
#include <boost/math/special_functions/erf.hpp>
#include <cmath>
#include <limits>
#include <numbers>

#include "deviascope/core/error.h"

namespace deviascope {

double normal_score(double rank, std::size_t n_draws) {
    using boost::math::policies::policy;
    using boost::math::policies::promote_double;
    const double p = (rank - 0.375) / (static_cast<double>(n_draws) + 0.25);
    return -std::numbers::sqrt2 *
           boost::math::erfc_inv(2.0 * p, policy<promote_double<false>>());
}

ScoreTable::ScoreTable(std::size_t n_draws) : score_(n_draws) {
    // Scores are antisymmetric about the middle rank, so half of them are enough.
    for (std::size_t place = 0; 2 * place + 1 < n_draws; ++place) {
        score_[place] = normal_score(static_cast<double>(place + 1), n_draws);
        score_[n_draws - 1 - place] = -score_[place];
    }
}

double ScoreTable::of(std::size_t first, std::size_t last) const {
    if (last == first + 1) return score_[first];
    const double average_rank = 0.5 * static_cast<double>(first + 1 + last);
    return normal_score(average_rank, score_.size());
}

PlacedDraws sorted(std::span<const double> draws) {
    ensure(draws.size() <= std::numeric_limits<std::uint32_t>::max(),
           "the draws of one scalar can be counted in 32 bits");
    PlacedDraws out(draws.size());
    for (std::size_t place = 0; place < draws.size(); ++place)
        out[place] = {draws[place], static_cast<std::uint32_t>(place)};
    std::sort(out.begin(), out.end(), [](const Placed& a, const Placed& b) {
        return a.value < b.value;
    });
    return out;
}

double quantile(std::span<const Placed> sorted_draws, double probability) {
    const double position = probability * static_cast<double>(sorted_draws.size() - 1);
    const auto below = static_cast<std::size_t>(position);
    const std::size_t above = std::min(below + 1, sorted_draws.size() - 1);
    const double share = position - static_cast<double>(below);
    if (share == 0.0) return sorted_draws[below].value;
    return (1.0 - share) * sorted_draws[below].value + share * sorted_draws[above].value;
}

PlacedDraws folded(std::span<const Placed> sorted_draws, double centre) {
    const auto distance = [&](const Placed& draw) { return std::abs(draw.value - centre); };
    const auto middle =
        std::partition_point(sorted_draws.begin(), sorted_draws.end(), [&](const Placed& draw) {
            return draw.value < centre;
        });
    // Distances rise away from the centre on either side: merge the two sides.
    auto right = middle;
    auto left = middle;
    PlacedDraws out(sorted_draws.size());
    for (Placed& next : out) {
        const bool take_right =
            left == sorted_draws.begin() ||
            (right != sorted_draws.end() && distance(*right) <= distance(*(left - 1)));
        const Placed& draw = take_right ? *right++ : *--left;
        next = {distance(draw), draw.place};
    }
    return out;
}

LargeArray scores_by_place(std::span<const Placed> sorted_draws, const ScoreTable& table) {
    LargeArray scores(sorted_draws.size());
    std::size_t first = 0;
    while (first < sorted_draws.size()) {
        std::size_t last = first + 1;
        while (last < sorted_draws.size() &&
               sorted_draws[last].value == sorted_draws[first].value)
            ++last;
        const double score = table.of(first, last);
        for (std::size_t tied = first; tied < last; ++tied)
            scores[sorted_draws[tied].place] = score;
        first = last;
    }
    return scores;
}

}  // namespace deviascope
