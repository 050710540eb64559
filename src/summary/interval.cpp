// SPDX-License-Identifier: GPL-2.0-or-later
#include "deviascope/summary/interval.h"

#include <algorithm>
#include <cmath>
#include <limits>

#include "deviascope/core/error.h"
#include "deviascope/core/physical_constants.h"

namespace deviascope {
namespace {

constexpr double undefined = std::numeric_limits<double>::quiet_NaN();

}  // namespace

std::size_t draws_holding(std::size_t n, double probability) {
    ensure(probability > 0.0 && probability <= 1.0, "a probability lies in (0, 1]");
    // 0.6827 x 10000 must not become 6828 by the last bit of the product.
    constexpr double slack = 1.0 - 4.0 * std::numeric_limits<double>::epsilon();
    const auto wanted =
        static_cast<std::size_t>(std::ceil(probability * static_cast<double>(n) * slack));
    return std::clamp<std::size_t>(wanted, 1, n);
}

Interval shortest_interval(std::span<const double> sorted, double probability) {
    if (sorted.empty()) return {undefined, undefined};
    const std::size_t width = draws_holding(sorted.size(), probability) - 1;
    std::size_t best = 0;
    for (std::size_t first = 1; first + width < sorted.size(); ++first)
        if (sorted[first + width] - sorted[first] < sorted[best + width] - sorted[best])
            best = first;
    return {sorted[best], sorted[best + width]};
}

double quantile_of(std::span<const double> sorted, double probability) {
    if (sorted.empty()) return undefined;
    return sorted[draws_holding(sorted.size(), probability) - 1];
}

double median_of(std::span<const double> sorted) {
    if (sorted.empty()) return undefined;
    const std::size_t middle = sorted.size() / 2;
    if (sorted.size() % 2 == 1) return sorted[middle];
    return sorted[middle - 1] + 0.5 * (sorted[middle] - sorted[middle - 1]);
}

ScalarEstimate estimate_of(std::vector<double> values) {
    std::sort(values.begin(), values.end());
    ScalarEstimate estimate;
    estimate.median = median_of(values);
    estimate.interval68 = shortest_interval(values, level68);
    estimate.interval95 = shortest_interval(values, level95);
    if (values.size() < 2) {
        estimate.mean = estimate.median;
        return estimate;
    }
    // About the median first: a constant then has sd 0 to the last bit.
    const auto n = static_cast<double>(values.size());
    double shift = 0.0;
    for (const double value : values) shift += value - estimate.median;
    shift /= n;
    double squares = 0.0;
    for (const double value : values)
        squares += (value - estimate.median - shift) * (value - estimate.median - shift);
    estimate.mean = estimate.median + shift;
    estimate.sd = std::sqrt(squares / (n - 1.0));
    return estimate;
}

}  // namespace deviascope
