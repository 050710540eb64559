// SPDX-License-Identifier: GPL-2.0-or-later
// chain -> SUMMARY -> figures
#pragma once

#include <array>
#include <cstddef>
#include <limits>
#include <span>
#include <vector>

namespace deviascope {

/// A closed interval.
using Interval = std::array<double, 2>;

/// Number of draws, out of n >= 1, that "hold" a probability: ceil(probability x n), 1 … n.
std::size_t draws_holding(std::size_t n, double probability);

/// Shortest window of ceil(probability x n) of the sorted values (highest-density interval of a
/// one-lobed posterior); the lowest of equals. NaN ends for no values.
/// Source: Chen & Shao 1999, J. Comput. Graph. Stat. 8, 69 (from memory), with the count
/// rounded up.
Interval shortest_interval(std::span<const double> sorted, double probability);

/// The smallest of the sorted values that at least probability x n of them do not exceed. NaN
/// for none.
double quantile_of(std::span<const double> sorted, double probability);

/// Median of sorted values (mean of the middle two). NaN for none.
double median_of(std::span<const double> sorted);

/// Location and spread of a scalar posterior. NaN where undefined (no values; sd of one value).
struct ScalarEstimate {
    double median = std::numeric_limits<double>::quiet_NaN();
    double mean = std::numeric_limits<double>::quiet_NaN();
    double sd = std::numeric_limits<double>::quiet_NaN();  ///< with n - 1; exactly 0: constant
    Interval interval68{std::numeric_limits<double>::quiet_NaN(),
                        std::numeric_limits<double>::quiet_NaN()};
    Interval interval95{std::numeric_limits<double>::quiet_NaN(),
                        std::numeric_limits<double>::quiet_NaN()};

    /// True where the values do not vary: fixed by a prior, not estimated.
    bool is_constant() const { return sd == 0.0; }
};
/// @param values  any order, none NaN
ScalarEstimate estimate_of(std::vector<double> values);

}  // namespace deviascope
