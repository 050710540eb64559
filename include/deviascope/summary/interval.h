// SPDX-License-Identifier: GPL-2.0-or-later
// chain -> SUMMARY -> figures
#pragma once

#include <array>
#include <span>
#include <vector>

namespace deviascope {

/// A closed interval.
using Interval = std::array<double, 2>;

/// Shortest window of ceil(probability x n) of the sorted values (highest-density interval of a
/// one-lobed posterior); the lowest of equals. NaN ends for no values.
Interval shortest_interval(std::span<const double> sorted, double probability);

/// Median of sorted values (mean of the middle two). NaN for none.
double median_of(std::span<const double> sorted);

/// Location and spread of a scalar posterior.
struct ScalarEstimate {
    double median, mean, sd;
    Interval interval68, interval95;
};
ScalarEstimate estimate_of(std::vector<double> values);

}  // namespace deviascope
