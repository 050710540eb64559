// SPDX-License-Identifier: GPL-2.0-or-later
// catalogue -> COUNTS -> model
#pragma once

#include "deviascope/counts/count_map.h"

namespace deviascope {

/// What two surveys of the same counts have in common on the sky.
struct SkyOverlap {
    double shared_sky_fraction = 0.0;  ///< pixels that a bin of each keeps, over all pixels
    /// Sources of the second that have one of the first within the radius by chance, were each
    /// survey spread evenly inside every pixel: sum n2 [1 - exp(-n1 pi r^2 / Omega)].
    double expected_by_chance = 0.0;
};

/// @param radius  radians, small against a pixel. Threads: pure.
SkyOverlap sky_overlap(const Counts& counts,
                       std::size_t first,
                       std::size_t second,
                       double radius);

}  // namespace deviascope
