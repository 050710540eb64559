// SPDX-License-Identifier: GPL-2.0-or-later
#include "deviascope/ensemble/sampler.h"
#include "deviascope/ensemble/memory_sink.h"

#include <algorithm>
#include <array>
#include <atomic>
#include <catch2/catch.hpp>
#include <chrono>
#include <cmath>
#include <limits>
#include <string>
#include <thread>
#include <vector>

#include "deviascope/core/error.h"
#include "deviascope/ensemble/diagnostics.h"
#include "file_bytes.h"
#include "test_targets.h"

using namespace deviascope;
using namespace deviascope::test;

namespace {

EnsembleOptions quick() {
    EnsembleOptions options;
    options.seed = 20260817;
    options.replicates = 3;
    options.effective_draws = 1000;
    options.max_steps = 6000;
    return options;
}

struct Result {
    Outcome outcome;
    MemorySink sink;
};

Result run(const Target& target, const EnsembleOptions& options) {
    Result result;
    result.outcome = sample(target, options, result.sink);
    return result;
}

/// Bits, so that NaN equals NaN.
bool same_draws(const Draws& a, const Draws& b) {
    return a.n_rows == b.n_rows && same_bits(a.value, b.value) &&
           same_bits(a.log_posterior, b.log_posterior) &&
           same_bits(a.log_likelihood, b.log_likelihood);
}

void check_same_run(const Result& a, const Result& b) {
    CHECK(a.outcome.end == b.outcome.end);
    CHECK(a.outcome.steps == b.outcome.steps);
    CHECK(a.outcome.discarded == b.outcome.discarded);
    CHECK(a.outcome.store_every == b.outcome.store_every);
    CHECK(a.outcome.tally.tried == b.outcome.tally.tried);
    CHECK(a.outcome.tally.taken == b.outcome.tally.taken);
    CHECK(a.sink.kept_warm_up.step == b.sink.kept_warm_up.step);
    CHECK(same_draws(a.sink.kept_warm_up.buffer, b.sink.kept_warm_up.buffer));
    CHECK(same_draws(a.sink.draws, b.sink.draws));
    REQUIRE_FALSE(a.sink.states.empty());
    REQUIRE_FALSE(b.sink.states.empty());
    CHECK(same_bits(a.sink.states.back().coordinates, b.sink.states.back().coordinates));
}

}  // namespace

TEST_CASE("a run that converges says so, and its rows bear it out", "[ensemble]") {
    const VectorTarget target;
    const Result result = run(target, quick());
    const Outcome& outcome = result.outcome;
    REQUIRE(outcome.end == Outcome::End::converged);
    CHECK(outcome.warm_up_settled);
    CHECK(outcome.steps < 6000);
    CHECK(outcome.n_rows == result.sink.draws.n_rows);
    CHECK(outcome.n_rows >= 8);
    CHECK(outcome.n_rows == (outcome.steps - outcome.discarded) / outcome.store_every);
    const auto scalars = monitored_scalars(target.parameters(), target.vectors());
    CHECK(scalars.size() == 7);
    for (const ScalarDiagnostics& found :
         diagnose(scalars, result.sink.draws, outcome.store_every, 2)) {
        CHECK(found.walker_rhat < 1.05);
        CHECK(found.replicate_rhat < 1.01);
        CHECK(found.effective_draws() >= 1000);
    }
}

TEST_CASE("a run stops at the first look that passes", "[ensemble]") {
    // Every earlier look of the same run, worked out afresh from its rows, must fail.
    const VectorTarget target;
    const EnsembleOptions options = quick();
    const Result result = run(target, options);
    REQUIRE(result.outcome.end == Outcome::End::converged);
    const auto scalars = monitored_scalars(target.parameters(), target.vectors());
    int n_looks = 0;
    for (const std::int64_t step : {128, 192, 256, 384, 512, 768, 1024, 1536, 2048, 3072}) {
        ++n_looks;
        if (step == result.outcome.steps - result.outcome.discarded) break;
        Draws rows = result.sink.draws;
        rows.n_rows = step / result.outcome.store_every;
        bool passes = rows.n_rows >= 8;
        for (const auto& found : diagnose(scalars, rows, result.outcome.store_every, 1))
            passes = passes && found.walker_rhat < 1.05 && found.replicate_rhat < 1.01 &&
                     found.effective_draws() >= options.effective_draws;
        CHECK_FALSE(passes);
    }
    CHECK(n_looks > 1);
    CHECK(n_looks < 11);
}

TEST_CASE("the interval of stored rows is half the warm-up's autocorrelation time",
          "[ensemble]") {
    const VectorTarget target;
    const Result result = run(target, quick());
    const WarmUp& warm_up = result.sink.kept_warm_up;
    REQUIRE(warm_up.settled);
    REQUIRE(result.sink.n_warm_ups == 1);
    REQUIRE(warm_up.step.back() == warm_up.discarded);
    const std::int64_t spacing = warm_up.step[0];
    Draws half = warm_up.buffer;
    half.n_rows = warm_up.buffer.n_rows / 2;
    half.value.erase(half.value.begin(),
                     half.value.begin() + static_cast<std::ptrdiff_t>(half.value.size() / 2));
    double longest = 0.0;
    for (const auto& found :
         diagnose(monitored_scalars(target.parameters(), target.vectors()), half, spacing, 1)) {
        CHECK(found.walker_rhat < 1.10);
        CHECK(found.replicate_rhat < 1.05);
        longest = std::max(longest, found.autocorrelation_steps);
    }
    CHECK(warm_up.store_every == static_cast<std::int64_t>(std::ceil(0.5 * longest)));
    CHECK(result.outcome.store_every == warm_up.store_every);
    CHECK(result.outcome.discarded == warm_up.discarded);
}

TEST_CASE("any number of threads gives the same bits", "[ensemble]") {
    const VectorTarget target;
    EnsembleOptions options = quick();
    options.walkers = 42;
    const Result one = run(target, options);
    for (const int threads : {2, 3, 4, 7, 8}) {  // 3 replicates: 4 and 7 part the halves
        options.threads = threads;
        check_same_run(one, run(target, options));
    }
}

TEST_CASE("another seed gives another run", "[ensemble]") {
    const VectorTarget target;
    EnsembleOptions options = quick();
    const Result one = run(target, options);
    ++options.seed;
    CHECK_FALSE(same_draws(one.sink.draws, run(target, options).sink.draws));
}

namespace {

/// Takes its time at first, so that legs and blocks end elsewhere.
class SlowAtFirst : public ChainGaussian {
  public:
    SlowAtFirst() : ChainGaussian(3) {}
    void log_density(const Eigen::Ref<const Eigen::MatrixXd>& coordinates,
                     Eigen::Ref<Eigen::VectorXd> log_posterior,
                     Eigen::Ref<Eigen::VectorXd> log_likelihood) const override {
        if (coordinates.cols() > 1 && ++calls_ <= 6)
            std::this_thread::sleep_for(std::chrono::milliseconds(60));
        ChainGaussian::log_density(coordinates, log_posterior, log_likelihood);
    }

  private:
    mutable std::atomic<int> calls_ = 0;
};

}  // namespace

TEST_CASE("how long things take has no bearing on the draws", "[ensemble]") {
    check_same_run(run(ChainGaussian(3), quick()), run(SlowAtFirst(), quick()));
}

TEST_CASE("stored rows hold constants, redraws and densities", "[ensemble]") {
    const VectorTarget target;
    const Result result = run(target, quick());
    const Draws& draws = result.sink.draws;
    double sum_of_squares = 0.0;
    for (Eigen::Index row = 0; row < draws.n_rows; ++row)
        for (Eigen::Index replicate = 0; replicate < draws.n_replicates; ++replicate)
            for (Eigen::Index walker = 0; walker < draws.n_walkers; ++walker) {
                const double* at = draws.row_of(row, replicate, walker);
                const auto index = static_cast<std::size_t>(
                    (row * draws.n_replicates + replicate) * draws.n_walkers + walker);
                REQUIRE(at[3] == 7.0);
                REQUIRE(draws.log_posterior[index] == target.log_density_at(at));
                REQUIRE(draws.log_likelihood[index] == draws.log_posterior[index]);
                const std::int64_t step =
                    result.outcome.discarded + (row + 1) * result.outcome.store_every;
                Stream stream(quick().seed,
                              Purpose::monopole_redraw,
                              static_cast<std::uint64_t>(replicate),
                              static_cast<std::uint64_t>(walker),
                              static_cast<std::uint64_t>(step));
                const double residual = normal(stream);
                REQUIRE(at[4] == at[0] + residual);
                sum_of_squares += residual * residual;
            }
    const auto n = static_cast<double>(draws.log_posterior.size());
    CHECK(std::abs(sum_of_squares / n - 1.0) < 4.0 * std::sqrt(2.0 / n));
    // In the warm-up, what is redrawn is not there yet.
    const Draws& buffer = result.sink.kept_warm_up.buffer;
    CHECK(std::isnan(buffer.at(0, 0, 0, 4)));
    CHECK(buffer.at(0, 0, 0, 3) == 7.0);
}

TEST_CASE("rows are stored every so many steps where the user says so", "[ensemble]") {
    EnsembleOptions options = quick();
    options.store_every = 7;
    const Result sparse = run(VectorTarget(), options);
    CHECK(sparse.outcome.store_every == 7);
    options.store_every = 1;
    options.effective_draws = 1e9;
    options.max_steps = 2 * sparse.outcome.steps;  // the same limit for the warm-up and more
    const Result dense = run(VectorTarget(), options);
    REQUIRE(dense.outcome.discarded == sparse.outcome.discarded);
    for (Eigen::Index row = 0; row < sparse.outcome.n_rows; ++row)
        for (Eigen::Index parameter : {0, 1, 2, 3, 4})
            REQUIRE(sparse.sink.draws.at(row, 1, 5, parameter) ==
                    dense.sink.draws.at(7 * row + 6, 1, 5, parameter));
}

TEST_CASE("the warm-up ends at the last look up to half of max_steps at the latest",
          "[ensemble]") {
    // Two lobes that no move connects: the warm-up cannot settle.
    const TwoLobes target(20, 40.0);
    EnsembleOptions options = quick();
    for (const auto& [max_steps, discarded] :
         std::vector<std::pair<std::int64_t, std::int64_t>>{
             {2, 1}, {3, 1}, {200, 100}, {255, 127}, {256, 128}, {400, 192}, {1000, 384}}) {
        CAPTURE(max_steps);
        options.max_steps = max_steps;
        const Result result = run(target, options);
        CHECK(result.outcome.end == Outcome::End::max_steps);
        CHECK(result.outcome.steps == max_steps);
        CHECK(result.outcome.discarded == discarded);
        CHECK_FALSE(result.outcome.warm_up_settled);
        CHECK_FALSE(result.sink.kept_warm_up.settled);
        // However slow the mixing, a doubtful run has rows to judge it by.
        CHECK(result.outcome.n_rows >= std::min<std::int64_t>(16, max_steps - discarded));
    }
}

TEST_CASE("a run interrupted in its warm-up stores nothing", "[ensemble]") {
    EnsembleOptions options = quick();
    options.stop_requested = [] { return true; };
    const Result result = run(VectorTarget(), options);
    CHECK(result.outcome.end == Outcome::End::interrupted);
    CHECK(result.outcome.steps == 0);
    CHECK(result.sink.n_warm_ups == 0);
    CHECK(result.sink.draws.n_rows == 0);
}

TEST_CASE("an interrupted run has delivered the first rows of the whole run", "[ensemble]") {
    const Result whole = run(VectorTarget(), quick());
    Result part;
    EnsembleOptions options = quick();
    options.rows_per_block = 3;
    options.stop_requested = [&] { return part.sink.draws.n_rows > 0; };
    part.outcome = sample(VectorTarget(), options, part.sink);
    REQUIRE(part.outcome.end == Outcome::End::interrupted);
    const Draws& rows = part.sink.draws;
    REQUIRE(rows.n_rows > 0);
    REQUIRE(rows.n_rows < whole.sink.draws.n_rows);
    CHECK(part.outcome.n_rows == rows.n_rows);
    CHECK(std::equal(rows.value.begin(), rows.value.end(), whole.sink.draws.value.begin()));
    CHECK(part.outcome.steps < whole.outcome.steps);
    const EnsembleState& state = part.sink.states.back();
    const std::int64_t last_row_step =
        part.outcome.discarded + rows.n_rows * part.outcome.store_every;
    CHECK(state.step >= last_row_step);
    CHECK(state.step < last_row_step + part.outcome.store_every);
}

TEST_CASE("blocks hold the rows between them and the state after them", "[ensemble]") {
    const Result result = run(VectorTarget(), quick());
    const auto& states = result.sink.states;
    Eigen::Index n_rows = 0;
    for (std::size_t block = 0; block < states.size(); ++block) {
        CHECK(result.sink.block_rows[block] > 0);
        n_rows += result.sink.block_rows[block];
        CHECK((states[block].step - result.outcome.discarded) / result.outcome.store_every ==
              n_rows);
        std::int64_t tried = 0;
        for (const std::int64_t count : states[block].tally.tried) tried += count;
        CHECK(tried == states[block].step * 3 * 32);
    }
    CHECK(states.back().step == result.outcome.steps);
    CHECK(states.back().coordinates.size() == 3U * 32U * 3U);
}

TEST_CASE("a target without coordinates is stored as it is", "[ensemble]") {
    const ChainGaussian target(0);
    EnsembleOptions options = quick();
    const Result result = run(target, options);
    CHECK(result.outcome.end == Outcome::End::converged);
    CHECK(result.outcome.discarded == 128);
    CHECK(result.outcome.store_every == 1);
    CHECK(result.outcome.n_rows == 128);
}

namespace {

/// Not a number beyond 1.5 along the first axis; starts well inside.
class BrokenBeyond : public CoordinateTarget {
  public:
    explicit BrokenBeyond(double value) : CoordinateTarget(2), value_(value) {}
    double log_density_at(const double* x) const override {
        return x[0] > 1.5 ? value_ : -0.5 * (x[0] * x[0] + x[1] * x[1]);
    }
    void draw_start(Stream& stream, Eigen::Ref<Eigen::VectorXd> coordinates) const override {
        for (double& x : coordinates) x = uniform(stream) - 0.5;
    }

  private:
    double value_;
};

/// Finite nowhere, or only in one attempt of about `one_in`.
class HardToStart : public ChainGaussian {
  public:
    explicit HardToStart(double share) : ChainGaussian(1), share_(share) {}
    double log_density_at(const double* x) const override {
        return x[0] > share_ ? -std::numeric_limits<double>::infinity() : -x[0];
    }
    void draw_start(Stream& stream, Eigen::Ref<Eigen::VectorXd> coordinates) const override {
        coordinates[0] = uniform(stream);
    }

  private:
    double share_;
};

}  // namespace

TEST_CASE("a log density that is not a number stops the run and names the place",
          "[ensemble]") {
    for (const double value :
         {std::numeric_limits<double>::quiet_NaN(), std::numeric_limits<double>::infinity()})
        for (const int threads : {1, 2, 5}) {
            EnsembleOptions options = quick();
            options.threads = threads;
            MemorySink sink;
            try {
                sample(BrokenBeyond(value), options, sink);
                FAIL("the run went on");
            } catch (const NumericalError& error) {
                CHECK_THAT(error.what(), Catch::StartsWith("replicate "));
                CHECK_THAT(error.what(), Catch::Contains("x0 = 1."));
                CHECK_THAT(error.what(), Catch::Contains("x1 = "));
            }
        }
}

TEST_CASE("walkers are redrawn until they start inside the support", "[ensemble]") {
    const HardToStart target(0.002);
    EnsembleOptions options = quick();
    options.max_steps = 2;
    const Result result = run(target, options);
    for (const double value : result.sink.kept_warm_up.buffer.value) CHECK(value <= 0.002);
    MemorySink sink;
    CHECK_THROWS_AS(sample(HardToStart(-1.0), options, sink), NumericalError);
    CHECK_THROWS_WITH(sample(HardToStart(-1.0), options, sink), Catch::Contains("10000"));
}

TEST_CASE("options that break rules are refused together", "[ensemble]") {
    EnsembleOptions options = quick();
    options.replicates = 0;
    options.kernels = {0.5, 0.0, 0.4};
    MemorySink sink;
    try {
        sample(VectorTarget(), options, sink);
        FAIL("the options were taken");
    } catch (const UsageError& error) {
        CHECK(error.messages().size() == 2);
    }
}

TEST_CASE("progress is told in lines of our own", "[ensemble]") {
    EnsembleOptions options = quick();
    std::vector<std::string> lines;
    options.progress = [&](const std::string& line) { lines.push_back(line); };
    run(VectorTarget(), options);
    REQUIRE(lines.size() > 4);
    CHECK_THAT(lines.front(), Catch::StartsWith("step ") && Catch::EndsWith("warming up"));
    CHECK_THAT(lines.back(), Catch::Contains("of 1 000 effective draws"));
}
