// SPDX-License-Identifier: GPL-2.0-or-later
#include "deviascope/ensemble/options.h"

#include <catch2/catch.hpp>

using namespace deviascope;

namespace {

EnsembleOptions with(void (*change)(EnsembleOptions&)) {
    EnsembleOptions options;
    change(options);
    return options;
}

}  // namespace

TEST_CASE("walkers default to four per coordinate and at least 32", "[ensemble]") {
    const EnsembleOptions options;
    CHECK(options.walkers_for(0) == 32);
    CHECK(options.walkers_for(8) == 32);
    CHECK(options.walkers_for(9) == 36);
    CHECK(options.walkers_for(36) == 144);
    CHECK(with([](EnsembleOptions& o) { o.walkers = 50; }).walkers_for(9) == 50);
}

TEST_CASE("the default options are in order", "[ensemble]") {
    for (const Eigen::Index n : {0, 1, 9, 36, 200})
        CHECK(EnsembleOptions{}.problems(n).empty());
}

TEST_CASE("each violated rule of the options is named with its value", "[ensemble]") {
    struct Case {
        void (*change)(EnsembleOptions&);
        const char* key;
        const char* value;
    };
    const Case cases[] = {
        {[](EnsembleOptions& o) { o.replicates = 0; }, "replicates", "0"},
        {[](EnsembleOptions& o) { o.walkers = 19; }, "walkers", "19"},
        {[](EnsembleOptions& o) { o.walkers = 18; }, "walkers", "18"},
        {[](EnsembleOptions& o) { o.walkers = -2; }, "walkers", "-2"},
        {[](EnsembleOptions& o) { o.effective_draws = 0.0; }, "effective_draws", "0"},
        {[](EnsembleOptions& o) { o.max_steps = 1; }, "max_steps", "1"},
        {[](EnsembleOptions& o) { o.store_every = -1; }, "store_every", "-1"},
        {[](EnsembleOptions& o) { o.store_every = 200001; }, "store_every", "200001"},
        {[](EnsembleOptions& o) { o.kernels.stretch = 0.5; }, "kernels", "1.3"},
        {[](EnsembleOptions& o) { o.threads = 0; }, "threads", "0"}};
    for (const Case& one : cases) {
        const auto problems = with(one.change).problems(9);
        REQUIRE(problems.size() == 1);
        CHECK_THAT(problems[0], Catch::StartsWith(std::string(one.key) + ": "));
        CHECK_THAT(problems[0], Catch::Contains(one.value));
    }
    CHECK(with([](EnsembleOptions& o) { o.walkers = 20; }).problems(9).empty());
}

TEST_CASE("all violated rules are listed at once", "[ensemble]") {
    const auto problems = with([](EnsembleOptions& o) {
                              o.replicates = -1;
                              o.walkers = 7;
                              o.kernels = {-1.0, 1.0, 0.0};
                              o.threads = -3;
                          }).problems(9);
    CHECK(problems.size() == 5);  // the kernels break two rules
}

TEST_CASE("kernels are named as in the job file", "[ensemble]") {
    CHECK(name_of(Kernel::stretch) == "stretch");
    CHECK(name_of(Kernel::differential_evolution) == "differential-evolution");
    CHECK(name_of(Kernel::independence) == "independence");
}
