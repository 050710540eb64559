// SPDX-License-Identifier: GPL-2.0-or-later
#pragma once

#include <cmath>
#include <cstddef>
#include <cstdint>
#include <vector>

#include "deviascope/core/random.h"
#include "deviascope/sky/direction.h"
#include "deviascope/sky/pixelisation.h"

namespace deviascope::test {

/// A point of the sky where pixel numbers are hard: an axis, the seam between belt and caps
/// (|z| = 2/3), the pole limit (|z| = 0.99), a meridian through pixel corners, the middle of
/// two pixel centres, moved by 1e-18 to 1e-3; or, one time in two, a random point of the whole
/// sky.
inline Direction hard_direction(Stream& stream) {
    Eigen::Vector3d v;
    for (double& component : v) component = normal(stream);
    v.normalize();
    const double kind = std::floor(10.0 * uniform(stream));
    const double shift = std::pow(10.0, -3.0 - 15.0 * uniform(stream));
    const double a = uniform(stream);
    const double b = uniform(stream);
    Eigen::Vector3d anchor;
    if (kind == 0) {
        anchor = Eigen::Vector3d::Unit(int(3.0 * a)) * (b < 0.5 ? 1.0 : -1.0);
    } else if (kind == 1 || kind == 2) {
        const double z = (kind == 1 ? 2.0 / 3.0 : 0.99) * (b < 0.5 ? 1.0 : -1.0);
        const Direction around = direction_of(360.0 * a, 0.0) * std::sqrt(1.0 - z * z);
        anchor = {around.x(), around.y(), z};
    } else if (kind == 3) {
        anchor = direction_of(std::floor(64.0 * a) * 360.0 / 64.0, 180.0 * b - 90.0);
    } else if (kind == 4) {
        const Pixelisation grid(1 << int(14.0 * a));
        const auto pixel = std::int64_t(b * double(grid.n_pixels() - 1));
        anchor = grid.centre(pixel) + grid.centre(pixel + 1);
        if (anchor.norm() < 0.5) anchor = grid.centre(pixel);
    } else {
        return v;
    }
    return (anchor + shift * v).normalized();
}

inline std::vector<Direction> hard_directions(std::uint64_t seed, std::size_t n) {
    Stream stream(seed, Purpose::test, 0, 0, 0);
    std::vector<Direction> directions;
    directions.reserve(n);
    while (directions.size() < n) directions.push_back(hard_direction(stream));
    return directions;
}

}  // namespace deviascope::test
