// SPDX-License-Identifier: GPL-2.0-or-later
#include "ensemble/warm_up_buffer.h"

#include <catch2/catch.hpp>
#include <vector>

using namespace deviascope;

namespace {

Draws one_walker() {
    Draws draws;
    draws.n_replicates = 1;
    draws.n_walkers = 1;
    draws.n_parameters = 2;
    return draws;
}

/// Runs to `step` in legs of at most `leg` steps; every value written is the step itself.
void run_to(std::int64_t step, std::int64_t leg, std::int64_t& at, WarmUpBuffer& buffer) {
    while (at < step) {
        buffer.make_room();
        const std::int64_t end = std::min({at + leg, step, buffer.last_step_that_fits()});
        buffer.extend_to(end);
        for (++at; at <= end; ++at) {
            if (!buffer.keeps(at)) continue;
            const auto row = static_cast<std::size_t>(buffer.row_of(at));
            const auto value = static_cast<double>(at);
            buffer.rows().value[2 * row] = value;
            buffer.rows().value[2 * row + 1] = -value;
            buffer.rows().log_posterior[row] = value;
            buffer.rows().log_likelihood[row] = value;
        }
        at = end;
    }
}

/// The rule as it is written: keep every 2^j-th step; when full, drop every second row and let
/// j grow.
std::vector<std::int64_t> kept_by_the_rule(std::int64_t last_step) {
    std::vector<std::int64_t> kept;
    std::int64_t spacing = 1;
    for (std::int64_t step = 1; step <= last_step; ++step) {
        if (kept.size() == 512) {
            spacing *= 2;
            std::erase_if(kept, [&](std::int64_t old) { return old % spacing != 0; });
        }
        if (step % spacing == 0) kept.push_back(step);
    }
    return kept;
}

}  // namespace

TEST_CASE("the warm-up buffer keeps every 2^j-th step and at most 512 rows", "[ensemble]") {
    for (const std::int64_t leg : {1, 7, 100, 100000}) {
        WarmUpBuffer buffer(one_walker());
        std::int64_t at = 0;
        for (const std::int64_t step : {1, 2, 128, 511, 512, 513, 768, 1024, 1025, 5000}) {
            run_to(step, leg, at, buffer);
            const std::vector<std::int64_t> kept = kept_by_the_rule(step);
            REQUIRE(buffer.steps() == kept);
            REQUIRE(buffer.draws().n_rows == static_cast<Eigen::Index>(kept.size()));
            REQUIRE(buffer.draws().n_rows <= 512);
            for (std::size_t row = 0; row < kept.size(); ++row) {
                const auto value = static_cast<double>(kept[row]);
                REQUIRE(buffer.draws().value[2 * row] == value);
                REQUIRE(buffer.draws().value[2 * row + 1] == -value);
                REQUIRE(buffer.draws().log_posterior[row] == value);
                REQUIRE(buffer.draws().log_likelihood[row] == value);
            }
        }
        CHECK(buffer.spacing() == 16);
    }
}

TEST_CASE("the later half of the warm-up buffer", "[ensemble]") {
    WarmUpBuffer buffer(one_walker());
    CHECK(buffer.later_half() == 0);
    buffer.extend_to(1);
    CHECK(buffer.later_half() == 1);  // one row has no later half
    buffer.extend_to(128);
    CHECK(buffer.later_half() == 64);
    buffer.extend_to(5);
    CHECK(buffer.later_half() == 3);
}
