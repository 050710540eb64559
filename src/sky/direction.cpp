// SPDX-License-Identifier: GPL-2.0-or-later
#include "deviascope/sky/direction.h"

#include <Eigen/Geometry>
#include <cmath>
#include <cstdint>
#include <numbers>

#include "deviascope/core/error.h"

namespace deviascope {

namespace {

constexpr double degree = std::numbers::pi / 180.0;

struct SineCosine {
    double sine, cosine;
};

/// Sine and cosine of an angle in degrees, exact at every multiple of 90: the nearest multiple
/// is taken off without rounding before the angle becomes radians.
SineCosine sine_cosine(double angle_deg) {
    if (std::abs(angle_deg) > 0x1p40) angle_deg = std::remainder(angle_deg, 360.0);
    const auto quarter = std::int64_t(angle_deg / 90.0 + std::copysign(0.5, angle_deg));
    const double rest = (angle_deg - 90.0 * double(quarter)) * degree;
    // Quarter turns swap sine and cosine and change their signs; without a branch, for quarters
    // of random directions cannot be foretold.
    const double pair[2] = {std::sin(rest), std::cos(rest)};
    return {pair[quarter & 1] * double(1 - (quarter & 2)),
            pair[1 - (quarter & 1)] * double(1 - ((quarter + 1) & 2))};
}

/// The vector scaled so that its largest component is 1: products neither overflow nor vanish.
Eigen::Vector3d scaled(const Eigen::Vector3d& vector) {
    const double largest = vector.cwiseAbs().maxCoeff();
    ensure(largest > 0.0 && vector.allFinite(), "a direction has a finite, non-zero length");
    return vector / largest;
}

}  // namespace

Direction direction_of(double lon_deg, double lat_deg) {
    const SineCosine lon = sine_cosine(lon_deg);
    const SineCosine lat = sine_cosine(lat_deg);
    return {lat.cosine * lon.cosine, lat.cosine * lon.sine, lat.sine};
}

LonLat lon_lat_of(const Eigen::Vector3d& vector) {
    const Eigen::Vector3d v = scaled(vector);
    const double across = std::hypot(v.x(), v.y());
    const double lat_deg = std::atan2(v.z(), across) / degree;
    if (across == 0.0) return {0.0, lat_deg};
    double lon_deg = std::atan2(v.y(), v.x()) / degree;
    if (lon_deg < 0.0) lon_deg += 360.0;
    // A tiny negative longitude rounds up to 360; -0 must not be shown as such.
    if (lon_deg >= 360.0 || lon_deg == 0.0) lon_deg = 0.0;
    return {lon_deg, lat_deg};
}

double separation(const Eigen::Vector3d& a, const Eigen::Vector3d& b) {
    const Eigen::Vector3d p = scaled(a);
    const Eigen::Vector3d q = scaled(b);
    return std::atan2(p.cross(q).norm(), p.dot(q));
}

}  // namespace deviascope
