// SPDX-License-Identifier: GPL-2.0-or-later
// COUNTS (private): counts that no dipole makes
#pragma once

#include <optional>
#include <string>

#include "deviascope/counts/count_map.h"

namespace deviascope {

/// A sentence about the bin whose sources are most unevenly spread over two hemispheres, per
/// exposure; empty where none is worth it: where one hemisphere has less than 1.3 times the
/// sources of the other (an amplitude of 0.26), or the excess is below ten standard deviations.
/// The hemispheres are those about the vector sum of the excess counts.
std::optional<std::string> warning_of_lopsided_counts(const SurveyCounts& survey,
                                                      const Pixelisation& grid,
                                                      Frame frame);

}  // namespace deviascope
