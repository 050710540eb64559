// SPDX-License-Identifier: GPL-2.0-or-later
// SKY: where things are, no sources
#pragma once

#include <Eigen/Core>

namespace deviascope {

/// A unit vector; x towards (lon 0, lat 0), z towards lat +90 deg of its frame.
using Direction = Eigen::Vector3d;

/// Longitude 0 … 360 (360 excluded) and latitude -90 … 90, in degrees.
struct LonLat {
    double lon_deg = 0.0;
    double lat_deg = 0.0;
};

/// Unit vector of a longitude and latitude in degrees; exact on the axes (lon a multiple of 90
/// and lat 0, or lat +-90). Domain: all finite values. Accuracy: 9e-16 a component.
Direction direction_of(double lon_deg, double lat_deg);

/// Longitude and latitude of a vector of any non-zero length; at the poles lon_deg is 0.
/// Errors: InternalError if the vector is zero or not finite.
LonLat lon_lat_of(const Eigen::Vector3d& vector);

/// Angle between two vectors of any non-zero length, radians, 0 … pi: atan2(|a x b|, a.b),
/// accurate for nearly equal and nearly opposite vectors (9e-16 rad).
/// Errors: InternalError if a vector is zero or not finite.
double separation(const Eigen::Vector3d& a, const Eigen::Vector3d& b);

}  // namespace deviascope
