// SPDX-License-Identifier: GPL-2.0-or-later
#include <catch2/catch.hpp>
#include <functional>
#include <utility>

#include "deviascope/core/error.h"
#include "deviascope/ensemble/memory_sink.h"
#include "deviascope/ensemble/sampler.h"
#include "same_chain.h"
#include "test_targets.h"

using namespace deviascope;
using namespace deviascope::test;

namespace {

EnsembleOptions in_small_blocks() {
    EnsembleOptions options;
    options.seed = 20260817;
    options.replicates = 3;
    options.effective_draws = 2000;
    options.max_steps = 3000;
    options.rows_per_block = 2;
    return options;
}

/// What was stored when `n_blocks` blocks were.
StoredRun first_part(const MemorySink& sink, std::size_t n_blocks) {
    StoredRun stored;
    stored.warm_up = sink.kept_warm_up;
    stored.state = sink.states[n_blocks - 1];
    stored.draws = sink.draws;
    stored.draws.n_rows = 0;
    for (std::size_t block = 0; block < n_blocks; ++block)
        stored.draws.n_rows += sink.block_rows[block];
    const auto n_points = static_cast<std::size_t>(
        stored.draws.n_rows * stored.draws.n_replicates * stored.draws.n_walkers);
    stored.draws.value.resize(n_points * static_cast<std::size_t>(stored.draws.n_parameters));
    stored.draws.log_posterior.resize(n_points);
    stored.draws.log_likelihood.resize(n_points);
    return stored;
}

/// Rows of the first part and of a sink, together.
Draws joined(Draws first, const Draws& second) {
    const auto add = [](auto& to, const auto& from) {
        to.insert(to.end(), from.begin(), from.end());
    };
    first.n_rows += second.n_rows;
    add(first.value, second.value);
    add(first.log_posterior, second.log_posterior);
    add(first.log_likelihood, second.log_likelihood);
    return first;
}

void check_resumed_everywhere(const Target& target, EnsembleOptions options) {
    MemorySink whole;
    const Outcome outcome = sample(target, options, whole);
    REQUIRE(whole.states.size() >= 12);
    for (std::size_t n_blocks = 1; n_blocks <= whole.states.size(); ++n_blocks) {
        CAPTURE(n_blocks);
        options.threads = 1 + static_cast<int>(n_blocks % 3);
        options.rows_per_block = n_blocks % 2 == 0 ? 0 : 5;
        StoredRun stored = first_part(whole, n_blocks);
        const Draws before = stored.draws;
        MemorySink rest;
        CHECK(same(resume_sampling(target, options, std::move(stored), rest), outcome));
        CHECK(rest.n_warm_ups == 0);
        CHECK(same(joined(before, rest.draws), whole.draws));
        CHECK((rest.states.empty() || same(rest.states.back(), whole.states.back())));
    }
}

/// The Gaussian that a target offers.
CoordinateGaussian offered() {
    return {Eigen::Vector3d(0.1, -0.2, 0.3), Eigen::Matrix3d::Identity() * 1.5};
}

}  // namespace

TEST_CASE("a run taken up after any block ends as one that never stopped", "[ensemble]") {
    check_resumed_everywhere(VectorTarget(), in_small_blocks());
}

TEST_CASE("a run with the independence kernel is taken up as well", "[ensemble]") {
    const ChainGaussian plainly(3);
    check_resumed_everywhere(Approximated(plainly, offered()), in_small_blocks());
}

TEST_CASE("a run that is cut at max_steps is taken up to that end, between rows too",
          "[ensemble]") {
    EnsembleOptions options = in_small_blocks();
    options.effective_draws = 1e9;
    options.max_steps = 600;
    options.store_every = 7;
    check_resumed_everywhere(ChainGaussian(3), options);
}

TEST_CASE("the Gaussian a target offers is fixed with the warm-up", "[ensemble]") {
    const ChainGaussian plainly(3);
    const Approximated target(plainly, offered());
    MemorySink sink;
    sample(target, in_small_blocks(), sink);
    REQUIRE(sink.kept_warm_up.approximation.has_value());
    CHECK(sink.kept_warm_up.approximation->mean == target.approximation()->mean);
    CHECK(sink.kept_warm_up.approximation->factor == target.approximation()->factor);
    MemorySink plain;
    sample(VectorTarget(), in_small_blocks(), plain);
    CHECK_FALSE(plain.kept_warm_up.approximation.has_value());
}

TEST_CASE("a stored run that does not fit the job is an input error", "[ensemble]") {
    const VectorTarget target;
    const EnsembleOptions options = in_small_blocks();
    MemorySink whole, rest;
    sample(target, options, whole);
    const auto resumed = [&](const std::function<void(StoredRun&)>& spoil) {
        StoredRun stored = first_part(whole, 2);
        spoil(stored);
        return resume_sampling(target, options, std::move(stored), rest);
    };
    CHECK_THROWS_WITH(resumed([](StoredRun& s) { s.draws.n_walkers = 30; }),
                      Catch::Contains("replicates and walkers"));
    CHECK_THROWS_WITH(resumed([](StoredRun& s) { s.draws.n_parameters = 4; }),
                      Catch::Contains("parameters"));
    CHECK_THROWS_WITH(resumed([](StoredRun& s) { s.state.coordinates.pop_back(); }),
                      Catch::Contains("state"));
    CHECK_THROWS_WITH(resumed([](StoredRun& s) { s.state.step += 1000; }),
                      Catch::Contains("as many as its steps make"));
    CHECK_THROWS_WITH(resumed([](StoredRun& s) { s.warm_up.store_every = 0; }),
                      Catch::Contains("as many as its steps make"));
    CHECK_THROWS_AS(resumed([](StoredRun& s) {
                        s.warm_up.approximation = CoordinateGaussian{
                            Eigen::Vector2d::Zero(), Eigen::Matrix2d::Identity()};
                    }),
                    InputError);
    CHECK(rest.states.empty());
}
