// SPDX-License-Identifier: GPL-2.0-or-later
// JOB: TOML to the options of the stages
#pragma once

#include <filesystem>
#include <string>

#include "deviascope/mock/scenario.h"

namespace deviascope {

/// Reads a scenario file (TOML 1.0): what a mock sky is made of.
///
///   [scenario]
///   title = "…"                 # optional: the file name
///   seed = 20260817             # required, 0 … 2^63-1
///   frame = "galactic"          # of the vectors: galactic (default) | icrs | ecliptic
///
///   [velocity]                  # optional: at rest. One of
///   vector = [0.0, 0.0, 1e-3]   #   components, units of c
///   speed_km_s = 1500.0         #   speed in km/s, or amplitude in units of c,
///   lon_deg = 210.0             #   and the direction
///   lat_deg = 35.0
///
///   [[survey]]
///   name = "dunlin"             # required, [a-z0-9-]+
///   sources = 2.0e6             # required: mean number over the full sky, before any cut
///   intrinsic = { amplitude = 0.02, lon_deg = 60.0, lat_deg = -20.0 }   # or { vector = […] }
///   alpha = { mean = 0.75, sd = 0.2 }          # S ~ nu^-alpha; sd optional; default 0.75, 0
///   flux = { kind = "power-law", minimum = 5.0, slope = 1.1 }
///        # { kind = "broken-power-law", minimum = 5.0, break = 40.0, faint_slope = 0.7,
///        #   bright_slope = 2.0 }
///        # { kind = "double-power-law", minimum = 5.0, turn = 40.0, faint_slope = 0.7,
///        #   bright_slope = 2.0 }
///   redshift = { scale = 0.9, power = 1.5 }    # P(<z) = 1 - (1+t) e^-t, t = (z/scale)^power
///   magnitude = { slope = 0.48, limit = 22.0 } # N(<m) ~ 10^(slope m) up to limit
///   size = { median = 2.0, sd_ln = 0.6 }       # log-normal
///   scatter = { flux = 0.05, redshift = 0.02, magnitude = 0.1, size = 0.1 }
///               # Gaussian: fraction, times (1+z), magnitudes, fraction
///   extra_components = 0.0                     # each source is 1 + Poisson(this) rows
///   keep = { flux = [10.0, inf] }              # half-open ranges of measured values
///   exclude = [ … ]                            # as in job files
///   exposure = "map.fits"                      # HEALPix map 0 … 1 (map_frame = "…" where it
///                                              # has no COORDSYS), or a map that is made:
///            # { lowest = 0.6, lon_deg = 0.0, lat_deg = 90.0, frame = "icrs", nside = 64,
///            #   file = "dunlin-exposure.fits" }: lowest there, 1 opposite
///   file = "dunlin.fits"                       # or .csv; default <name>.fits
///   frame = "icrs"                             # of the catalogue's positions, default icrs
///   columns = { lon = "RA", lat = "DEC", flux = "S", alpha = "ALPHA" }   # what is written
///   precision = "double"                       # or single: of the properties
///   table = "SOURCES"                          # name of the FITS table
///
/// A survey has those of flux, redshift, magnitude and size that it names. Relative paths are
/// relative to the scenario file.
/// Errors: UsageError with all faults, each `path:line:column: key: found; allowed; remedy`;
/// once the file is sound, with Scenario::problems().
Scenario read_scenario(const std::filesystem::path& path);

/// The same from a text.
/// @param name    of the file, as messages shall call it
/// @param folder  where relative paths start from
Scenario parse_scenario(const std::string& text,
                        const std::string& name,
                        const std::filesystem::path& folder);

}  // namespace deviascope
