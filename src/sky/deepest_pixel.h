// SPDX-License-Identifier: GPL-2.0-or-later
// SKY (private): pixels of HEALPix orders up to the deepest
#pragma once

#include <cstdint>

#include "deviascope/sky/direction.h"

namespace deviascope {

/// NESTED number, at order 29, of the pixel that holds a direction.
/// Errors: InternalError unless it is a unit vector to 1e-6.
std::int64_t deepest_pixel_at(const Direction& direction);

/// Centre of the pixel with a NESTED number at an order, 0 … 29.
Direction centre_of_nested(std::int64_t nested, int order);

}  // namespace deviascope
