// SPDX-License-Identifier: GPL-2.0-or-later
#include "figures/mollweide.h"

#include <algorithm>
#include <cmath>
#include <numbers>

#include "deviascope/core/physical_constants.h"

namespace deviascope {
namespace {

using std::numbers::pi;

/// t of a latitude's sine. Newton's method slows down at the poles, where t -> pi/2: there
/// pi - |pi sin(lat)| = (pi - 2t) - sin(pi - 2t) is solved for the small angle u = pi - 2t.
double auxiliary_angle(double sine) {
    const double rest = pi * (1.0 - std::abs(sine));  // u - sin u
    double u = std::min(std::cbrt(6.0 * rest), pi);
    for (int step = 0; step < 30; ++step) {
        // u - sin u loses digits at small u; its series does not.
        const double f =
            (u < 0.1 ? u * u * u / 6.0 * (1.0 - u * u / 20.0 * (1.0 - u * u / 42.0))
                     : u - std::sin(u)) -
            rest;
        const double slope = 2.0 * std::pow(std::sin(0.5 * u), 2);
        if (slope == 0.0) break;
        const double change = f / slope;
        u = std::clamp(u - change, 0.0, pi);
        if (std::abs(change) < 1e-15) break;
    }
    return std::copysign(0.5 * (pi - u), sine);
}

}  // namespace

Mollweide::Place Mollweide::project(const Direction& direction) const {
    const double lon = std::remainder(
        std::atan2(direction.y(), direction.x()) - centre_deg_ * radians_per_degree, 2.0 * pi);
    const double t = auxiliary_angle(std::clamp(direction.z(), -1.0, 1.0));
    return {-2.0 / pi * lon * std::cos(t), std::sin(t)};
}

std::optional<Direction> Mollweide::direction_at(const Place& place) const {
    if (0.25 * place.x * place.x + place.y * place.y > 1.0) return std::nullopt;
    const double t = std::asin(place.y);
    const double sine = std::clamp((2.0 * t + std::sin(2.0 * t)) / pi, -1.0, 1.0);
    const double cosine = std::sqrt(1.0 - sine * sine);
    const double width = std::cos(t);
    const double offset = width > 0.0 ? std::clamp(-0.5 * pi * place.x / width, -pi, pi) : 0.0;
    const double lon = centre_deg_ * radians_per_degree + offset;
    return Direction(cosine * std::cos(lon), cosine * std::sin(lon), sine);
}

Mollweide::Place Mollweide::inside(const Place& place) {
    const double size = std::sqrt(0.25 * place.x * place.x + place.y * place.y);
    if (size <= 0.9999) return place;
    return {place.x * 0.9999 / size, place.y * 0.9999 / size};
}

}  // namespace deviascope
