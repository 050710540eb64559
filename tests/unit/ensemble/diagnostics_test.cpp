// SPDX-License-Identifier: GPL-2.0-or-later
#include "deviascope/ensemble/diagnostics.h"

#include <catch2/catch.hpp>
#include <cmath>
#include <limits>
#include <numbers>

#include "deviascope/core/random.h"
#include "ensemble/normal_scores.h"
#include "ensemble/split_chains.h"

using namespace deviascope;

namespace {

double golden(int draw, int chain) {
    const double phi = (std::sqrt(5.0) - 1.0) / 2.0;
    const double sum = draw * phi + chain * std::sqrt(2.0);
    return sum - std::floor(sum);
}

/// 100 x 4: a low-discrepancy sequence with a slow wave.
Eigen::MatrixXd waves() {
    Eigen::MatrixXd chains(100, 4);
    for (int chain = 1; chain <= 4; ++chain)
        for (int draw = 1; draw <= 100; ++draw)
            chains(draw - 1, chain - 1) =
                golden(draw, chain) + 0.3 * std::sin(0.05 * draw * chain);
    return chains;
}

/// 250 x 4: AR(1) with coefficient 0.5, driven by the generator of Lewis, Goodman & Miller
/// 1969 (multiplier 16807, modulus 2^31 - 1).
Eigen::MatrixXd autoregressive() {
    Eigen::MatrixXd chains(250, 4);
    std::int64_t s = 12345;
    for (int chain = 1; chain <= 4; ++chain) {
        double x = 0.0;
        for (int draw = 0; draw < 250; ++draw) {
            double e = -6.0;
            for (int i = 0; i < 12; ++i) {
                s = 16807 * s % 2147483647;
                e += static_cast<double>(s) / 2147483647.0;
            }
            x = 0.5 * x + std::sqrt(0.75) * e;
            chains(draw, chain - 1) = x + 0.05 * (chain - 1);
        }
    }
    return chains;
}

/// 100 x 4: Cauchy tails, the last chain three times as wide.
Eigen::MatrixXd cauchy() {
    Eigen::MatrixXd chains(100, 4);
    for (int chain = 1; chain <= 4; ++chain)
        for (int draw = 1; draw <= 100; ++draw)
            chains(draw - 1, chain - 1) =
                std::tan(std::numbers::pi * (golden(draw, chain) - 0.5)) *
                (chain == 4 ? 3.0 : 1.0);
    return chains;
}

constexpr double ten_digits = 1e-10;

}  // namespace

// Values computed from the formulas of Vehtari et al. 2021 (Bayesian Analysis 16, 667) by two
// independent implementations that agree to 12 digits.
TEST_CASE("R-hat and effective draws of three data sets agree to ten digits", "[ensemble]") {
    struct Case {
        Eigen::MatrixXd chains;
        double first, last, rhat, bulk, tail;
    };
    const Case cases[] = {{waves(),
                           0.0472413019041933,
                           0.734136699700155,
                           1.02839964028,
                           96.5642067256,
                           430.370217289},
                          {autoregressive(),
                           -0.386420134196245,
                           0.0862005420052721,
                           1.00157602696,
                           385.660787134,
                           669.355649309},
                          {cauchy(),
                           std::numeric_limits<double>::quiet_NaN(),
                           std::numeric_limits<double>::quiet_NaN(),
                           1.04240193038,
                           902.811650042,
                           465.171489219}};
    for (const Case& one : cases) {
        if (!std::isnan(one.first)) {
            CHECK(one.chains(0, 0) == Approx(one.first).epsilon(1e-13));
            CHECK(one.chains(one.chains.rows() - 1, 3) == Approx(one.last).epsilon(1e-13));
        }
        CHECK(rank_normalised_split_rhat(one.chains) == Approx(one.rhat).epsilon(ten_digits));
        const EffectiveDraws found = effective_draws(one.chains);
        CHECK(found.bulk == Approx(one.bulk).epsilon(ten_digits));
        CHECK(found.tail == Approx(one.tail).epsilon(ten_digits));
    }
}
