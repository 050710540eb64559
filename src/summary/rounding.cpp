// SPDX-License-Identifier: GPL-2.0-or-later
#include "summary/rounding.h"
#include "deviascope/core/grouped_number.h"
#include "deviascope/core/physical_constants.h"

#include <fmt/format.h>

#include <algorithm>
#include <cmath>

namespace deviascope {
namespace {

constexpr int most_decimals = 12;

/// Decimals that show `digits` significant digits of a size; negative: tens, hundreds, …
int decimals_for(double size, int digits) {
    const int decimals = digits - 1 - static_cast<int>(std::floor(std::log10(size)));
    // 0.0996 to two digits is 0.10, not 0.100.
    const double unit = std::pow(10.0, -decimals);
    const bool carries = std::round(size / unit) >= std::pow(10.0, digits);
    return std::min(carries ? decimals - 1 : decimals, most_decimals);
}

std::string with_decimals(double value, int decimals) {
    if (decimals < 0) {
        const double unit = std::pow(10.0, -decimals);
        value = std::round(value / unit) * unit;
    }
    std::string digits = fmt::format("{:.{}f}", value, std::max(decimals, 0));
    if (digits.starts_with('-') && digits.find_first_not_of("-0.") == std::string::npos)
        digits.erase(0, 1);
    return grouped_digits(digits);
}

}  // namespace

std::string rounded(double value, double uncertainty) {
    if (!std::isfinite(value)) return "-";
    if (std::isfinite(uncertainty) && uncertainty > 0.0)
        return with_decimals(value, decimals_for(uncertainty, 2));
    return value == 0.0 ? "0" : with_decimals(value, decimals_for(std::abs(value), 4));
}

std::string rounded_longitude(double lon_deg, double lat_deg, double uncertainty) {
    const double across = std::max(std::cos(lat_deg * radians_per_degree), 1e-3);
    const double sd = std::min(uncertainty / across, 90.0);
    const std::string text = rounded(lon_deg, sd);
    return text.starts_with("360") ? rounded(0.0, sd) : text;
}

std::string short_number(double value) {
    if (!std::isfinite(value)) return "-";
    return value == 0.0 ? "0" : with_decimals(value, decimals_for(std::abs(value), 3));
}

std::string rounded(const Interval& interval, double uncertainty) {
    if (!std::isfinite(interval[0])) return "-";
    return rounded(interval[0], uncertainty) + " to " + rounded(interval[1], uncertainty);
}

double half_width(const Interval& interval) {
    return 0.5 * (interval[1] - interval[0]);
}

std::string csv_number(double value) {
    return std::isfinite(value) ? fmt::format("{}", value) : "";
}

ScalarEstimate in_unit(ScalarEstimate estimate, double unit) {
    for (double* value : {&estimate.median, &estimate.mean, &estimate.sd}) *value /= unit;
    for (Interval* interval : {&estimate.interval68, &estimate.interval95})
        *interval = {(*interval)[0] / unit, (*interval)[1] / unit};
    return estimate;
}

std::string rounded(const UpperLimits& limits, double unit) {
    return rounded(limits.limit95 / unit, 0.5 * limits.limit68 / unit);
}

}  // namespace deviascope
