// SPDX-License-Identifier: GPL-2.0-or-later
// COUNTS (private): a HEALPix map of counts to counts of a bin
#pragma once

#include "counts/row_counter.h"

namespace deviascope {

/// Adds the sources of the count map of bin `bin` to its tally; sources are judged, and entered
/// in the table of cuts, as rows of a catalogue would be, at the centre of their map's pixel.
/// Errors: InputError: a map in another frame, coarser than the grid, or with a value that is
/// no count; a pixel without value where the bin is exposed.
void count_map_sources(const Selection& selection,
                       std::size_t bin,
                       CutTable& cuts,
                       BinTally& tally);

}  // namespace deviascope
