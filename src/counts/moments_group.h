// SPDX-License-Identifier: GPL-2.0-or-later
// COUNTS, private: moments in an HDF5 file
#pragma once

#include <string>

#include "core/h5/reader.h"
#include "core/h5/writer.h"
#include "deviascope/counts/count_map.h"

namespace deviascope {

/// Writes `exposure_moments` (footprint x monomial) and `excess_moments` (bin x monomial) into
/// the group of a survey, with the digest of the pixels, exposures and counts they belong to;
/// nothing where a footprint or bin has none.
void write_moments(h5::Writer& writer, const std::string& path, const SurveyCounts& survey);

/// Fills the moments of a survey from its group where they are there.
/// Errors: InputError where their shape or digest is not that of the survey's counts.
void read_moments(const h5::Reader& reader, const std::string& path, SurveyCounts& survey);

}  // namespace deviascope
