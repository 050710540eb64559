// SPDX-License-Identifier: GPL-2.0-or-later
#include "ensemble/normal_scores.h"

#include <algorithm>
#include <catch2/catch.hpp>
#include <cmath>
#include <vector>

#include "deviascope/core/random.h"

using namespace deviascope;

TEST_CASE("normal scores are quantiles of the standard normal", "[ensemble]") {
    // Quantiles at 0.975, 0.95 and 0.84134…: standard tables (Abramowitz & Stegun, table 26.5).
    const auto score_at = [](double p) { return normal_score(p * 100.25 + 0.375, 100); };
    CHECK(score_at(0.5) == Approx(0.0).margin(1e-15));
    CHECK(score_at(0.975) == Approx(1.959963984540054).epsilon(1e-13));
    CHECK(score_at(0.05) == Approx(-1.6448536269514722).epsilon(1e-13));
    CHECK(score_at(0.8413447460685429) == Approx(1.0).epsilon(1e-13));
}

TEST_CASE("a score table holds the score of every rank", "[ensemble]") {
    for (const std::size_t n : {1U, 2U, 5U, 100U, 4097U}) {
        const ScoreTable table(n);
        for (std::size_t place = 0; place < n; ++place)
            REQUIRE(table.of(place, place + 1) ==
                    Approx(normal_score(static_cast<double>(place + 1), n)).margin(1e-14));
    }
    // Ties share the score of their average rank: ranks 2, 3, 4 of 5 average to the middle.
    CHECK(ScoreTable(5).of(1, 4) == Approx(0.0).margin(1e-15));
    CHECK(ScoreTable(5).of(0, 2) == Approx(normal_score(1.5, 5)));
}

TEST_CASE("type-7 quantiles of a short list", "[ensemble]") {
    // Hyndman & Fan 1996, definition 7: position 1 + p (n - 1).
    const std::vector<double> draws = {4.0, 1.0, 3.0, 2.0};
    const auto order = sorted(draws);
    CHECK(quantile(order, 0.0) == 1.0);
    CHECK(quantile(order, 0.5) == 2.5);
    CHECK(quantile(order, 0.05) == Approx(1.15));
    CHECK(quantile(order, 1.0) == 4.0);
}

TEST_CASE("folding a sorted list sorts the distances and keeps the places", "[ensemble]") {
    for (std::uint64_t trial = 0; trial < 200; ++trial) {
        Stream stream(7, Purpose::test, trial, 0, 0);
        std::vector<double> draws(1 + trial % 37);
        // Coarse values: many ties, and distances equal on both sides.
        for (double& draw : draws) draw = std::round(3.0 * normal(stream));
        const auto order = sorted(draws);
        const double centre = quantile(order, 0.5);
        const auto fold = folded(order, centre);
        REQUIRE(fold.size() == draws.size());
        std::vector<bool> seen(draws.size(), false);
        for (std::size_t at = 0; at < fold.size(); ++at) {
            REQUIRE(fold[at].value == std::abs(draws[fold[at].place] - centre));
            REQUIRE((at == 0 || fold[at].value >= fold[at - 1].value));
            REQUIRE_FALSE(seen[fold[at].place]);
            seen[fold[at].place] = true;
        }
    }
}
