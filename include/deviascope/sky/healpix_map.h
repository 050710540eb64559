// SPDX-License-Identifier: GPL-2.0-or-later
// SKY: where things are, no sources
#pragma once

#include <filesystem>
#include <optional>
#include <string>
#include <vector>

#include "deviascope/sky/frame.h"

namespace deviascope {

/// A HEALPix map in memory: the full sky, RING order.
struct HealpixMap {
    int nside = 1;
    std::optional<Frame> frame;  ///< from COORDSYS (G, E, C in any case); empty where absent
    std::vector<double> value;   ///< 12 nside^2; NaN where absent, UNSEEN (-1.6375e30) or NaN
};

/// Reads the first value column of the first binary-table extension that is a HEALPix map: full
/// or partial sky (INDXSCHM EXPLICIT, column PIXEL), RING or NESTED, one or many values a row,
/// any numeric column type, TSCAL/TZERO/TNULL obeyed. Errors: InputError (path, header card or
/// row, what is allowed). Source: keywords as tabulated for the HEALPix FITS convention (Gorski
/// et al. 2005; HEALPix 3 documentation, common practice).
HealpixMap read_healpix_map(const std::filesystem::path& path);

/// Writes a full-sky RING map with complete headers (PIXTYPE, ORDERING, NSIDE, FIRSTPIX,
/// LASTPIX, INDXSCHM, OBJECT, COORDSYS). NaN is written as UNSEEN.
/// @param column  name of the value column, for instance `EXPOSURE`
/// Errors: OutputError.
void write_healpix_map(const std::filesystem::path& path,
                       const HealpixMap& map,
                       const std::string& column,
                       const std::string& unit = "");

}  // namespace deviascope
