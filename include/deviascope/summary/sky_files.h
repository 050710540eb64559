// SPDX-License-Identifier: GPL-2.0-or-later
// chain -> SUMMARY -> figures
#pragma once

#include <filesystem>
#include <optional>
#include <string>
#include <vector>

#include "deviascope/chain/chain.h"
#include "deviascope/sky/moc.h"
#include "deviascope/summary/direction_density.h"
#include "deviascope/summary/summary.h"

namespace deviascope {

struct SkyFileSource {
    const Chain& chain;
    const ParameterSpace& space;
    const Summary& summary;
    const std::vector<std::optional<DirectionDensity>>& directions;  ///< one a vector
};

/// Posterior probability of a direction in each pixel of a HEALPix map (RING), adding to 1.
///
/// The density at pixel centres times their solid angle where the 68 % radius spans at least
/// two pixels, else the share of the draws in each pixel. nside 64, or up to 256 where the
/// region is small. Frame of the map: `frame`.
/// @param draws  unit vectors of the chain, job's frame
std::vector<double> direction_probability(const DirectionDensity& density,
                                          const std::vector<Direction>& draws,
                                          Frame job_frame,
                                          Frame frame,
                                          int nside);

/// The smallest region of sky that holds a probability, as a MOC in ICRS: the HEALPix cells
/// whose centres have a density of at least the level. Cells are of one order, of which about
/// 5,000 make up the region (order 4 … 29), merged where four siblings are in it.
/// Accuracy: area within 2 % of the region's.
Moc region_moc(const DirectionDensity& density,
               const std::vector<Direction>& draws,
               Frame job_frame,
               double probability);

/// Writes, into a folder that is there, for every vector with a free direction
///   direction-<name>-galactic.fits, direction-<name>-icrs.fits   column DIRECTION_PROBABILITY
///   region68-<name>.moc.fits, region95-<name>.moc.fits           MOC 2.0
/// and residuals-<survey>.fits for every survey (column RESIDUAL: see summary/residuals.h; at
/// the job's nside, in its frame). <name>: velocity, intrinsic-<survey>, intrinsic-all.
/// Returns the names. Errors: OutputError. Threads: main thread only.
std::vector<std::string> write_sky_files(const SkyFileSource& source,
                                         const std::filesystem::path& folder);

}  // namespace deviascope
