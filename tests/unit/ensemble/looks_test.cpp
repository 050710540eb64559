// SPDX-License-Identifier: GPL-2.0-or-later
#include "ensemble/looks.h"

#include <catch2/catch.hpp>
#include <cmath>
#include <vector>

#include "deviascope/core/random.h"

using namespace deviascope;

namespace {

/// Rows of independent normal draws; parameter `shifted` has another mean in every walker,
/// parameter `constant` never changes.
Draws independent_rows(Eigen::Index n_rows, Eigen::Index n_parameters, int shifted) {
    Draws draws;
    draws.n_rows = n_rows;
    draws.n_replicates = 2;
    draws.n_walkers = 4;
    draws.n_parameters = n_parameters;
    Stream stream(11, Purpose::test, 0, 0, 0);
    for (Eigen::Index row = 0; row < n_rows; ++row)
        for (int walker = 0; walker < 8; ++walker)
            for (Eigen::Index parameter = 0; parameter < n_parameters; ++parameter) {
                const double draw = normal(stream);
                draws.value.push_back(parameter == shifted ? draw + 3.0 * walker : draw);
            }
    return draws;
}

std::vector<MonitoredScalar> parameters_of(const Draws& draws) {
    std::vector<MonitoredScalar> scalars;
    for (Eigen::Index parameter = 0; parameter < draws.n_parameters; ++parameter)
        scalars.push_back({"p", MonitoredScalar::Kind::parameter, parameter, 0});
    return scalars;
}

WatchedSeries watched_of(const Draws& draws) {
    WatchedSeries watched(parameters_of(draws), draws.n_replicates, draws.n_walkers);
    watched.append(draws, 0, draws.n_rows / 3, 1);
    watched.append(draws, draws.n_rows / 3, draws.n_rows, 2);
    return watched;
}

constexpr LookRule lenient{1.10, 1.05, 0.0};

}  // namespace

TEST_CASE("looks come at 128, 192, 256, 384, 512 and so on", "[ensemble]") {
    const std::vector<std::int64_t> expected = {
        128, 192, 256, 384, 512, 768, 1024, 1536, 2048, 3072};
    for (std::size_t look = 0; look < expected.size(); ++look)
        CHECK(step_of_look(static_cast<std::int64_t>(look)) == expected[look]);
}

TEST_CASE("a look passes where every scalar does", "[ensemble]") {
    const Draws draws = independent_rows(300, 3, -1);
    Watch watch(1);
    const LookResult found = watch.look(watched_of(draws), 5, lenient);
    CHECK(found.passed);
    CHECK(found.worst_rhat < 1.02);
    CHECK(found.worst_rhat > 0.99);
    // Independent draws: an autocorrelation time of one row, five steps.
    CHECK(found.longest_autocorrelation_steps == Approx(5.0).epsilon(0.2));
    CHECK_FALSE(watch.look(watched_of(draws), 5, {1.10, 1.05, 1e6}).passed);
}

TEST_CASE("a look fails by the one scalar that fails, whatever the threads", "[ensemble]") {
    for (const int shifted : {0, 1, 2, 4}) {
        const Draws draws = independent_rows(100, 5, shifted);
        for (const int threads : {1, 2, 3}) {
            Watch watch(threads);
            CHECK_FALSE(watch.look(watched_of(draws), 1, lenient).passed);
            // Once more: the failure is then tested first and alone.
            const LookResult again = watch.look(watched_of(draws), 1, lenient);
            CHECK_FALSE(again.passed);
            CHECK(again.worst_rhat > 1.5);
            CHECK(again.worst_rhat ==
                  diagnose(parameters_of(draws)[static_cast<std::size_t>(shifted)], draws, 1)
                      .worst_rhat());
            CHECK_FALSE(watch.look_at_all(watched_of(draws), 1, lenient).passed);
        }
    }
}

TEST_CASE("constants are left out of looks and a stuck scalar is not a constant",
          "[ensemble]") {
    Draws draws = independent_rows(64, 2, -1);
    for (std::size_t at = 0; at < draws.value.size(); at += 2) draws.value[at] = 7.0;
    Watch watch(1);
    CHECK(watch.look(watched_of(draws), 1, lenient).passed);
    // Every walker stands still, each at a place of its own.
    for (std::size_t at = 0; at < draws.value.size(); at += 2)
        draws.value[at] = static_cast<double>(at / 2 % 8);
    CHECK_FALSE(watch.look(watched_of(draws), 1, lenient).passed);
}

TEST_CASE("a look at too few rows does not pass", "[ensemble]") {
    Watch watch(1);
    for (const Eigen::Index n_rows : {0, 1, 2, 3})
        CHECK_FALSE(watch.look(watched_of(independent_rows(n_rows, 2, -1)), 1, lenient).passed);
}
