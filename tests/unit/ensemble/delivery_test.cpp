// SPDX-License-Identifier: GPL-2.0-or-later
#include "ensemble/delivery.h"

#include <catch2/catch.hpp>
#include <future>
#include <vector>

#include "deviascope/core/error.h"

using namespace deviascope;

namespace {

/// Notes what it is given; holds up or refuses the block it is told to.
class Harbour : public DrawSink {
  public:
    void warm_up(const WarmUp&) override {}
    void block(const Draws& rows, const EnsembleState& state) override {
        if (state.step == held_up) go_on.get_future().wait();
        if (state.step == refused) throw OutputError({"harbour", "is closed", "", ""});
        steps.push_back(state.step);
        values.insert(values.end(), rows.value.begin(), rows.value.end());
    }
    std::int64_t rows_together(Eigen::Index n_rows) const override {
        return n_rows == 0 ? 1 : 7;
    }

    std::int64_t held_up = -1, refused = -1;
    std::promise<void> go_on;
    std::vector<std::int64_t> steps;
    std::vector<double> values;
};

Draws rows_of(std::vector<double> values) {
    Draws draws;
    draws.n_rows = static_cast<Eigen::Index>(values.size());
    draws.n_replicates = draws.n_walkers = draws.n_parameters = 1;
    draws.value.assign(values.begin(), values.end());
    draws.log_posterior = draws.log_likelihood = std::move(values);
    return draws;
}

EnsembleState state_at(std::int64_t step) {
    EnsembleState state;
    state.step = step;
    return state;
}

}  // namespace

TEST_CASE("blocks are delivered whole and in order while others are made", "[ensemble]") {
    Harbour harbour;
    harbour.held_up = 2;
    Delivery delivery(harbour, rows_of({}));
    CHECK(delivery.rows_together() == 1);
    Draws rows = rows_of({1.0, 2.0});
    delivery.block(rows, state_at(1));
    CHECK(delivery.rows_together() == 7);
    CHECK(rows.n_rows == 0);
    CHECK(rows.value.empty());

    rows = rows_of({3.0, 4.0, 5.0});
    delivery.block(rows, state_at(2));
    CHECK(rows.n_rows == 0);
    rows = rows_of({6.0});  // while the second is held up
    delivery.settle_if_done();
    harbour.go_on.set_value();
    delivery.block(rows, state_at(3));
    delivery.settle();
    CHECK(harbour.steps == std::vector<std::int64_t>{1, 2, 3});
    CHECK(harbour.values == std::vector<double>{1.0, 2.0, 3.0, 4.0, 5.0, 6.0});
    CHECK(delivery.seconds_to_store() >= 0.0);
    delivery.settle();  // nothing is left to settle
}

TEST_CASE("a refused block is told of by the next call that can", "[ensemble]") {
    Harbour harbour;
    Draws rows = rows_of({1.0});
    SECTION("the next block, the end, or what is asked in between") {
        harbour.refused = 2;
        Delivery delivery(harbour, rows_of({}));
        delivery.block(rows, state_at(1));
        delivery.block(rows, state_at(2));
        const auto next = GENERATE(0, 1, 2);
        if (next == 0) CHECK_THROWS_AS(delivery.block(rows, state_at(3)), OutputError);
        if (next == 1) CHECK_THROWS_AS(delivery.settle(), OutputError);
        if (next == 2)
            CHECK_THROWS_AS(
                [&] {
                    for (;;) delivery.settle_if_done();
                }(),
                OutputError);
        CHECK(harbour.steps == std::vector<std::int64_t>{1});
    }
    SECTION("nobody asks: it is waited for all the same") {
        harbour.refused = 2;
        {
            Delivery delivery(harbour, rows_of({}));
            delivery.block(rows, state_at(1));
            delivery.block(rows, state_at(2));
        }
        CHECK(harbour.steps == std::vector<std::int64_t>{1});
    }
}
