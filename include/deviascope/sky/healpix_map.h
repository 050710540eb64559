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
    std::optional<Frame> frame;  ///< from COORDSYS; empty where absent or blank
    std::vector<double> value;   ///< 12 nside^2; NaN where absent, UNSEEN (-1.6375e30) or NaN
};

/// Reads the first numeric column of the first binary table that is a HEALPix map (PIXTYPE =
/// 'HEALPIX', or a card NSIDE): full sky, or partial (INDXSCHM = 'EXPLICIT', or no INDXSCHM and
/// a column PIXEL); RING or NESTED; one or many values a row; any numeric column type,
/// TSCAL/TZERO/TNULL obeyed. Infinities stay. COORDSYS, in any case: G or GALACTIC; E or
/// ECLIPTIC; C, Q, CELESTIAL, CELESTIAL2000, EQUATORIAL or ICRS (read as ICRS).
/// Errors: InputError (path; header card, column or row; what is allowed): NSIDE not a power of
/// two up to 8192, ORDERING absent, another COORDSYS, a wrong number of values, pixel numbers
/// out of range or repeated. Threads: main thread only.
/// Source: keywords as tabulated for the HEALPix FITS convention (Gorski et al. 2005; HEALPix 3
/// documentation, common practice).
HealpixMap read_healpix_map(const std::filesystem::path& path);

/// Writes a full-sky RING map with complete headers (PIXTYPE, ORDERING, NSIDE, FIRSTPIX,
/// LASTPIX, INDXSCHM, OBJECT, BAD_DATA, COORDSYS), in double precision, 1024 values a row where
/// they fit. NaN is written as UNSEEN.
/// @param column  name of the value column, for instance `EXPOSURE`
/// Errors: OutputError.
void write_healpix_map(const std::filesystem::path& path,
                       const HealpixMap& map,
                       const std::string& column,
                       const std::string& unit = "");

}  // namespace deviascope
