// SPDX-License-Identifier: GPL-2.0-or-later
// catalogue -> COUNTS -> model
#pragma once

#include <array>
#include <filesystem>
#include <string>

#include "deviascope/counts/count_map.h"

namespace deviascope {

/// Names of the two files that `write_count_maps` makes for a bin, relative to its folder:
/// `<survey>/<bin>-counts.fits` and `<survey>/<bin>-exposure.fits`.
std::array<std::filesystem::path, 2> names_of_count_maps(const std::string& survey,
                                                         const std::string& bin);

/// Writes the counts and the exposure of every bin as HEALPix maps (full sky, RING, the job's
/// nside and frame). Pixels that are not kept: UNSEEN in the counts, 0 in the exposure; so that
/// the two can be given back as `counts` and `exposure` of a bin.
/// Errors: OutputError. Threads: main thread only.
void write_count_maps(const Counts& counts, const std::filesystem::path& folder);

}  // namespace deviascope
