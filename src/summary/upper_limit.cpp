// SPDX-License-Identifier: GPL-2.0-or-later
#include "deviascope/summary/upper_limit.h"

#include <algorithm>
#include <cmath>

#include "deviascope/core/physical_constants.h"
#include "deviascope/summary/interval.h"

namespace deviascope {
namespace {

bool stands_high_at_zero(const LineDensity& density, const Support& support) {
    return support.lowest == 0.0 && !density.place.empty() && density.place.front() == 0.0 &&
           density.density.front() > std::exp(-2.0) * density.peak();
}

}  // namespace

std::optional<UpperLimits> upper_limits_of(std::vector<double> values,
                                           const LineDensity& density,
                                           const Support& support) {
    if (!stands_high_at_zero(density, support)) return std::nullopt;
    std::ranges::sort(values);
    return UpperLimits{quantile_of(values, level68), quantile_of(values, level95)};
}

}  // namespace deviascope
