// SPDX-License-Identifier: GPL-2.0-or-later
#include <boost/math/distributions/normal.hpp>
#include <catch2/catch.hpp>
#include <cmath>

#include "deviascope/core/physical_constants.h"
#include "deviascope/summary/upper_limit.h"
#include "drawn_values.h"

using namespace deviascope;

namespace {

constexpr std::size_t n_draws = 20000;

template <class Draw>
std::vector<double> drawn(std::uint64_t number, const Draw& draw) {
    return test::drawn_values(20261203, number, n_draws, draw);
}

std::optional<UpperLimits> limits(const std::vector<double>& values,
                                  const Support& support = {0.0, {}}) {
    const auto n = static_cast<double>(values.size());
    return upper_limits_of(values, line_density(values, n, support), support);
}

/// Length of a normal number about `mean`, sd 1. Its density at 0 is 2 exp(-mean^2 / 2) times
/// that of a normal one at its peak.
std::vector<double> folded_normal(std::uint64_t number, double mean) {
    return drawn(number, [mean](Stream& stream) { return std::abs(mean + normal(stream)); });
}

}  // namespace

TEST_CASE("upper limits are quantiles, within their sampling error", "[summary]") {
    const auto found = limits(folded_normal(1, 0.0));
    REQUIRE(found);
    const boost::math::normal unit;
    for (const auto& [limit, probability] :
         {std::pair{found->limit68, level68}, std::pair{found->limit95, level95}}) {
        const double truth = quantile(unit, 0.5 * (1.0 + probability));
        // Four standard errors sqrt(p (1 - p) / n) / f of an order statistic.
        const double error =
            std::sqrt(probability * (1.0 - probability) / n_draws) / (2.0 * pdf(unit, truth));
        CHECK(limit == Approx(truth).margin(4.0 * error));
    }
}

TEST_CASE("only amplitudes that are not told from zero have upper limits", "[summary]") {
    CHECK(limits(folded_normal(2, 1.0)));        // 2 exp(-1/2): above exp(-2)
    CHECK(limits(folded_normal(3, 1.5)));        // 0.65
    CHECK_FALSE(limits(folded_normal(4, 3.0)));  // 0.022
    CHECK_FALSE(limits(folded_normal(5, 20.0)));
    // The length of a normal vector has the factor r^2: high nowhere near zero.
    CHECK_FALSE(limits(drawn(6, [](Stream& stream) {
        const double x = normal(stream), y = normal(stream), z = normal(stream);
        return std::sqrt(x * x + y * y + z * z);
    })));
}

TEST_CASE("no upper limit where zero is not the end of the range", "[summary]") {
    const auto values = folded_normal(7, 0.0);
    CHECK_FALSE(limits(values, {}));
    CHECK_FALSE(limits(values, {-1.0, {}}));
    CHECK(limits(values, {0.0, 10.0}));
    CHECK_FALSE(limits(std::vector<double>(10, 0.0)));
    CHECK_FALSE(limits({}));
}
