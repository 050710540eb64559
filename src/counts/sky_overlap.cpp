// SPDX-License-Identifier: GPL-2.0-or-later
#include "deviascope/counts/sky_overlap.h"

#include <algorithm>
#include <cmath>
#include <numbers>

namespace deviascope {

namespace {

/// Sources of a survey in each pixel of the sky, -1 where no bin keeps it.
std::vector<double> sources_on_sky(const SurveyCounts& survey, const Pixelisation& grid) {
    std::vector<double> sources(static_cast<std::size_t>(grid.n_pixels()), -1.0);
    for (const BinCounts& bin : survey.bins) {
        const Footprint& footprint = survey.footprints[bin.footprint];
        for (std::size_t p = 0; p < bin.count.size(); ++p) {
            double& there = sources[static_cast<std::size_t>(footprint.pixel[p])];
            there = std::max(there, 0.0) + static_cast<double>(bin.count[p]);
        }
    }
    return sources;
}

}  // namespace

SkyOverlap sky_overlap(const Counts& counts,
                       std::size_t first,
                       std::size_t second,
                       double radius) {
    const Pixelisation grid(counts.nside);
    const std::vector<double> one = sources_on_sky(counts.surveys[first], grid);
    const std::vector<double> other = sources_on_sky(counts.surveys[second], grid);
    const double share_of_pixel = std::numbers::pi * radius * radius / grid.solid_angle();
    SkyOverlap overlap;
    for (std::size_t p = 0; p < one.size(); ++p) {
        if (one[p] < 0.0 || other[p] < 0.0) continue;
        overlap.shared_sky_fraction += 1.0 / static_cast<double>(one.size());
        overlap.expected_by_chance += other[p] * -std::expm1(-one[p] * share_of_pixel);
    }
    return overlap;
}

}  // namespace deviascope
