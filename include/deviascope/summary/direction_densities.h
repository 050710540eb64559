// SPDX-License-Identifier: GPL-2.0-or-later
// chain -> SUMMARY -> figures
#pragma once

#include <optional>
#include <vector>

#include "deviascope/chain/chain.h"
#include "deviascope/summary/direction_density.h"
#include "deviascope/summary/summary.h"

namespace deviascope {

/// The direction of every vector of a chain as the summary sees it: the same estimate, from the
/// same draws, in the job's frame. Empty where the direction is fixed or no draw has one.
/// Threads: works on `threads`; the same bits for any number.
std::vector<std::optional<DirectionDensity>> direction_densities(const Chain& chain,
                                                                 const Summary& summary,
                                                                 int threads);

}  // namespace deviascope
