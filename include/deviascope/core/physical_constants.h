// SPDX-License-Identifier: GPL-2.0-or-later
// CORE: under all stages
#pragma once

#include <numbers>

namespace deviascope {

/// Speed of light in km/s, exact (BIPM 2019, The International System of Units, 9th edition).
inline constexpr double speed_of_light_km_s = 299792.458;

/// Radians in a degree.
inline constexpr double radians_per_degree = std::numbers::pi / 180.0;

/// Square degrees in the full sphere, 4 pi (180 / pi)^2.
inline constexpr double full_sky_deg2 =
    4.0 * std::numbers::pi / (radians_per_degree * radians_per_degree);

/// Probability inside one and two standard deviations of a Gaussian: the levels of every
/// interval and region this program reports.
inline constexpr double level68 = 0.6827;
inline constexpr double level95 = 0.9545;

}  // namespace deviascope
