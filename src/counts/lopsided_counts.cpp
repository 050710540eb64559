// SPDX-License-Identifier: GPL-2.0-or-later
#include "counts/lopsided_counts.h"

#include <fmt/format.h>

#include <cmath>
#include <numeric>

namespace deviascope {

namespace {

constexpr double least_ratio = 1.3;
constexpr double least_significance = 10.0;

/// How a bin's sources are spread over two hemispheres.
struct Halves {
    Direction towards = Direction::UnitZ();
    double ratio = 1.0;  ///< sources per exposure there over those on the other side
    double significance = 0.0;
};

Halves halves_of(const BinCounts& bin, const Footprint& footprint, const Pixelisation& grid) {
    const auto n = static_cast<double>(bin.total());
    const double exposed =
        std::accumulate(footprint.exposure.begin(), footprint.exposure.end(), 0.0);
    Eigen::Vector3d excess = Eigen::Vector3d::Zero();
    for (std::size_t p = 0; p < bin.count.size(); ++p)
        excess += (bin.count[p] - n * footprint.exposure[p] / exposed) *
                  grid.centre(footprint.pixel[p]);
    Halves halves;
    if (n == 0.0 || excess.isZero(0.0)) return halves;
    halves.towards = excess.normalized();
    double n_there = 0.0, exposed_there = 0.0;
    for (std::size_t p = 0; p < bin.count.size(); ++p) {
        if (grid.centre(footprint.pixel[p]).dot(halves.towards) <= 0.0) continue;
        n_there += bin.count[p];
        exposed_there += footprint.exposure[p];
    }
    const double share = exposed_there / exposed;
    if (share <= 0.0 || share >= 1.0) return halves;
    halves.ratio = n_there / share / ((n - n_there) / (1.0 - share));
    halves.significance = (n_there - n * share) / std::sqrt(n * share * (1.0 - share));
    return halves;
}

/// Rounded, without a minus sign at zero.
double whole(double degrees) {
    return std::round(degrees) + 0.0;
}

std::string sentence(const BinCounts& bin, const Halves& halves, Frame frame) {
    const LonLat towards = lon_lat_of(halves.towards);
    const std::string amount =
        std::isfinite(halves.ratio)
            ? fmt::format("{:.3g} times as many sources for its exposure as the other",
                          halves.ratio)
            : std::string("all the sources, although the other is exposed");
    return fmt::format(
        "bin {}: the hemisphere about lon {:.0f}, lat {:.0f} deg ({}) holds {}: no dipole does "
        "this; check the frame and unit of the positions, the exclusions and the exposure",
        bin.name,
        whole(towards.lon_deg),
        whole(towards.lat_deg),
        name_of(frame),
        amount);
}

}  // namespace

std::optional<std::string> warning_of_lopsided_counts(const SurveyCounts& survey,
                                                      const Pixelisation& grid,
                                                      Frame frame) {
    Halves worst;
    const BinCounts* of = nullptr;
    for (const BinCounts& bin : survey.bins) {
        const Halves halves = halves_of(bin, survey.footprints[bin.footprint], grid);
        if (halves.significance < least_significance || halves.ratio < least_ratio) continue;
        if (of != nullptr && halves.ratio <= worst.ratio) continue;
        worst = halves;
        of = &bin;
    }
    if (of == nullptr) return {};
    return sentence(*of, worst, frame);
}

}  // namespace deviascope
