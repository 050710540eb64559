// SPDX-License-Identifier: GPL-2.0-or-later
// catalogue -> COUNTS -> model
#pragma once

#include <cstdint>
#include <string>
#include <vector>

#include "deviascope/catalogue/cut_report.h"
#include "deviascope/sky/frame.h"
#include "deviascope/sky/pixelisation.h"

namespace deviascope {

/// The kept pixels of one exposure map: RING numbers ascending, and exposure 0 < w <= 1 of
/// each.
struct Footprint {
    std::vector<std::int64_t> pixel;  ///< n_kept
    std::vector<double> exposure;     ///< n_kept
    std::vector<double> moment{};     ///< of the exposure: see counts/moments.h; may be empty

    /// Sky fraction: kept pixels over all pixels of the grid.
    double sky_fraction(const Pixelisation& grid) const;
    /// Sum of exposures times the pixel solid angle: E0 of the likelihood, steradian.
    double exposed_solid_angle(const Pixelisation& grid) const;
};

/// Counts of one bin on a footprint of its survey.
struct BinCounts {
    std::string name;
    std::size_t footprint = 0;            ///< index into SurveyCounts::footprints
    std::vector<std::uint32_t> count;     ///< n_kept of that footprint
    std::vector<double> excess_moment{};  ///< of the counts: see counts/moments.h; may be empty
    std::int64_t total() const;
};

/// All bins of a survey. Bins that share an exposure share a footprint.
struct SurveyCounts {
    std::string name;
    std::vector<Footprint> footprints;
    std::vector<BinCounts> bins;
    CutReport cuts;
};

/// What the likelihood is made from: counts per pixel, in the job's frame.
struct Counts {
    int nside = 1;
    Frame frame = Frame::galactic;
    std::vector<SurveyCounts> surveys;
};

}  // namespace deviascope
