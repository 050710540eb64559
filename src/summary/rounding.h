// SPDX-License-Identifier: GPL-2.0-or-later
// chain -> SUMMARY -> figures
#pragma once

#include <cstdint>
#include <string>

#include "deviascope/summary/interval.h"
#include "deviascope/summary/upper_limit.h"

namespace deviascope {

/// A number to two significant digits of its uncertainty (common practice); to four digits of
/// its own where the uncertainty is zero or undefined. Thousands are set apart by blanks. `-`
/// for a number that is undefined.
std::string rounded(double value, double uncertainty);

/// A longitude in degrees, rounded by the uncertainty of the direction (degrees of arc) at its
/// latitude; never `360`.
std::string rounded_longitude(double lon_deg, double lat_deg, double uncertainty);

/// A number to three significant digits.
std::string short_number(double value);

/// A field of CSV: the shortest form that reads back to the same bits; empty where not finite.
std::string csv_number(double value);

/// `2.41 to 2.93`, to the digits of an uncertainty.
std::string rounded(const Interval& interval, double uncertainty);

/// Half the width of an interval: the uncertainty by which its numbers are rounded.
double half_width(const Interval& interval);

/// An estimate in another unit: location and spread divided by it.
ScalarEstimate in_unit(ScalarEstimate estimate, double unit);

/// The 95.45 % limit in another unit, to two digits of half the 68.27 % limit.
std::string rounded(const UpperLimits& limits, double unit);

}  // namespace deviascope
