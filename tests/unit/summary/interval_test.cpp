// SPDX-License-Identifier: GPL-2.0-or-later
#include "deviascope/summary/interval.h"

#include <algorithm>
#include <catch2/catch.hpp>
#include <cmath>
#include <numeric>
#include <vector>

#include "deviascope/core/physical_constants.h"
#include "deviascope/core/random.h"

using namespace deviascope;

TEST_CASE("the shortest interval holds ceil(P n) draws", "[summary]") {
    // Counted by hand: of ten values, P = 0.6827 takes seven.
    const std::vector<double> sorted{0, 5, 6, 7, 8, 9, 10, 11, 30, 31};
    CHECK(shortest_interval(sorted, level68) == Interval{5, 11});
    CHECK(shortest_interval(sorted, level95) == Interval{0, 31});
    CHECK(shortest_interval(sorted, 0.1) == Interval{0, 0});  // all alike: the lowest
    CHECK(shortest_interval(sorted, 0.2) == Interval{5, 6});  // the lowest of equals
    CHECK(shortest_interval(std::vector<double>{4.0}, level68) == Interval{4, 4});
    CHECK(std::isnan(shortest_interval({}, level68)[0]));
}

TEST_CASE("draws that hold a probability are not miscounted by rounding", "[summary]") {
    CHECK(draws_holding(10000, level68) == 6827);
    CHECK(draws_holding(10000, level95) == 9545);
    CHECK(draws_holding(10001, level68) == 6828);
    CHECK(draws_holding(1, level68) == 1);
    CHECK(draws_holding(7, 1.0) == 7);
    for (std::size_t n = 10000; n < 1000000; n += 10000)
        CHECK(draws_holding(n, level68) == n / 10000 * 6827);
}

TEST_CASE("an interval against every window, on random lumpy values", "[summary]") {
    for (std::uint64_t round = 0; round < 20; ++round) {
        Stream stream(20260817, Purpose::test, 1, round, 0);
        std::vector<double> values(3 + round * 5);
        for (double& value : values) value = std::floor(10.0 * normal(stream));
        std::sort(values.begin(), values.end());
        const Interval found = shortest_interval(values, level68);
        const auto inside = [&](double low, double high) {
            return std::upper_bound(values.begin(), values.end(), high) -
                   std::lower_bound(values.begin(), values.end(), low);
        };
        const auto wanted = static_cast<std::ptrdiff_t>(
            std::ceil(level68 * static_cast<double>(values.size())));
        CHECK(inside(found[0], found[1]) >= wanted);
        std::ptrdiff_t most_in_shorter = 0;
        for (const double low : values)
            for (const double high : values)
                if (high - low < found[1] - found[0])
                    most_in_shorter = std::max(most_in_shorter, inside(low, high));
        CHECK(most_in_shorter < wanted);
    }
}

TEST_CASE("quantiles and medians by hand", "[summary]") {
    const std::vector<double> sorted{1, 2, 4, 8};
    CHECK(median_of(sorted) == 3.0);
    CHECK(median_of(std::vector<double>{1, 2, 4}) == 2.0);
    CHECK(std::isnan(median_of({})));
    CHECK(quantile_of(sorted, 0.5) == 2.0);
    CHECK(quantile_of(sorted, 0.51) == 4.0);
    CHECK(quantile_of(sorted, 1.0) == 8.0);
}

TEST_CASE("estimates of a scalar", "[summary]") {
    const ScalarEstimate estimate = estimate_of({3, 1, 2, 6});
    CHECK(estimate.median == 2.5);
    CHECK(estimate.mean == 3.0);
    CHECK(estimate.sd == Approx(std::sqrt(14.0 / 3.0)).epsilon(1e-15));
    CHECK_FALSE(estimate.is_constant());
    // 0.1 has no exact double: the mean of many must not make it look like it varies.
    const ScalarEstimate constant = estimate_of(std::vector<double>(1001, 0.1));
    CHECK(constant.is_constant());
    CHECK(constant.mean == 0.1);
    const ScalarEstimate one = estimate_of({2.0});
    CHECK(one.median == 2.0);
    CHECK(std::isnan(one.sd));
    CHECK(std::isnan(estimate_of({}).mean));
}

TEST_CASE("intervals of a normal sample are near one and two standard deviations",
          "[summary]") {
    Stream stream(20260817, Purpose::test, 2, 0, 0);
    std::vector<double> values(200000);
    for (double& value : values) value = 7.0 + 2.0 * normal(stream);
    const ScalarEstimate estimate = estimate_of(values);
    // 68.27 % and 95.45 % of a normal lie within 1 and 2 standard deviations (definition). The
    // length of a shortest interval of n draws scatters by about 1/sqrt(n) of itself.
    CHECK(estimate.interval68[1] - estimate.interval68[0] == Approx(4.0).epsilon(0.015));
    CHECK(estimate.interval95[1] - estimate.interval95[0] == Approx(8.0).epsilon(0.015));
    CHECK(estimate.mean == Approx(7.0).margin(0.02));
    CHECK(estimate.sd == Approx(2.0).epsilon(0.01));
}
