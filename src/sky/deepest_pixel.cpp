// SPDX-License-Identifier: GPL-2.0-or-later
#include "sky/deepest_pixel.h"

#include <healpix_base.h>

#include <cmath>

#include "deviascope/core/error.h"

namespace deviascope {

std::int64_t deepest_pixel_at(const Direction& direction) {
    static const T_Healpix_Base<std::int64_t> cells(29, NEST);
    ensure(std::abs(direction.squaredNorm() - 1.0) < 1e-6, "a direction is a unit vector");
    return cells.vec2pix({direction.x(), direction.y(), direction.z()});
}

Direction centre_of_nested(std::int64_t nested, int order) {
    ensure(order >= 0 && order <= 29 && nested >= 0 && nested < std::int64_t{12} << 2 * order,
           "a NESTED number is one of its order");
    const T_Healpix_Base<std::int64_t> cells(order, NEST);
    const vec3 centre = cells.pix2vec(nested);
    return Direction(centre.x, centre.y, centre.z);
}

}  // namespace deviascope
