// SPDX-License-Identifier: GPL-2.0-or-later
// catalogue -> COUNTS -> model (private): counts as a group of an HDF5 file, shared by
// counts.h5 and chains.h5
#pragma once

#include <string>

#include "core/h5/reader.h"
#include "core/h5/writer.h"
#include "deviascope/counts/count_map.h"

namespace deviascope {

/// Writes counts as a new group (layout in the README). Names of surveys and bins become names
/// in the file. Errors: OutputError; InternalError where counts do not fit their footprints, or
/// a name is empty or holds a slash.
void write_counts_group(h5::Writer& writer, const std::string& group, const Counts& counts);

/// Reads them back, the same bit for bit.
/// Errors: InputError: anything missing, sizes that disagree, pixels not ascending or not of
/// the grid, exposures outside 0 … 1.
Counts read_counts_group(const h5::Reader& reader, const std::string& group);

}  // namespace deviascope
