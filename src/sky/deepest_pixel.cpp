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

}  // namespace deviascope
