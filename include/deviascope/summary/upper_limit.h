// SPDX-License-Identifier: GPL-2.0-or-later
// chain -> SUMMARY -> figures
#pragma once

#include <optional>
#include <vector>

#include "deviascope/summary/line_density.h"

namespace deviascope {

/// Values that 68.27 % and 95.45 % of the draws do not exceed.
struct UpperLimits {
    double limit68 = 0.0, limit95 = 0.0;
};

/// Limits of a scalar that the draws do not tell from 0, the lowest value it can take: its
/// density there is above exp(-2) of the peak, the height of a Gaussian at the end of its
/// 95.45 % interval. An interval about the median would then claim a lower end that the draws
/// do not know. Empty where the density is lower at 0, undefined, or does not end there.
/// @param values   any order, none NaN
/// @param density  line_density of the values on the support
std::optional<UpperLimits> upper_limits_of(std::vector<double> values,
                                           const LineDensity& density,
                                           const Support& support);

}  // namespace deviascope
