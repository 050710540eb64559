// SPDX-License-Identifier: GPL-2.0-or-later
#include "deviascope/summary/sky_files.h"

#include <fmt/format.h>

#include <Eigen/Geometry>

#include <algorithm>
#include <cmath>
#include <deque>
#include <numbers>
#include <unordered_set>

#include "deviascope/core/error.h"
#include "deviascope/core/physical_constants.h"
#include "deviascope/sky/healpix_map.h"
#include "deviascope/summary/draw_values.h"
#include "deviascope/summary/residuals.h"
#include "sky/deepest_pixel.h"

namespace deviascope {
namespace {

/// nside of a probability map: pixels of 0.92 deg, or finer for a small region.
int map_nside(const VectorSummary& vector) {
    const double radius =
        vector.region68 && vector.region68->radius_deg ? *vector.region68->radius_deg : 90.0;
    return radius < 1.0 ? 256 : radius < 2.5 ? 128 : 64;
}

std::string file_name_of(const VectorParameter& vector) {
    std::string name = vector.name;
    std::replace(name.begin(), name.end(), '.', '-');
    return name;
}

/// Share of the draws in each pixel.
std::vector<double> shares_of(const std::vector<Direction>& draws,
                              const Eigen::Matrix3d& to_map,
                              const Pixelisation& grid) {
    std::vector<double> share(std::size_t(grid.n_pixels()));
    for (const Direction& draw : draws)
        share[std::size_t(grid.pixel_at((to_map * draw).normalized()))] +=
            1.0 / static_cast<double>(draws.size());
    return share;
}

void write_maps(const SkyFileSource& source,
                std::size_t index,
                const std::vector<Direction>& draws,
                const std::filesystem::path& folder,
                std::vector<std::string>& names) {
    const VectorSummary& vector =
        index == 0 ? source.summary.velocity : source.summary.intrinsic[index - 1];
    const int nside = map_nside(vector);
    for (const Frame frame : {Frame::galactic, Frame::icrs}) {
        names.push_back(fmt::format(
            "direction-{}-{}.fits", file_name_of(source.chain.vectors[index]), name_of(frame)));
        write_healpix_map(
            folder / names.back(),
            {nside,
             frame,
             direction_probability(
                 *source.directions[index], draws, source.summary.frame, frame, nside)},
            "DIRECTION_PROBABILITY");
    }
}

void write_regions(const SkyFileSource& source,
                   std::size_t index,
                   const std::vector<Direction>& draws,
                   const std::filesystem::path& folder,
                   std::vector<std::string>& names) {
    for (const auto& [probability, label] :
         {std::pair{level68, "region68"}, std::pair{level95, "region95"}}) {
        names.push_back(
            fmt::format("{}-{}.moc.fits", label, file_name_of(source.chain.vectors[index])));
        write_moc(
            folder / names.back(),
            region_moc(*source.directions[index], draws, source.summary.frame, probability));
    }
}

/// Grows a region of cells from those that draws lie in, over every edge and corner.
class CellRegion {
  public:
    CellRegion(const DirectionDensity& density,
               double level,
               const Eigen::Matrix3d& to_icrs,
               int order)
        : density_(density),
          level_(level),
          to_icrs_(to_icrs),
          order_(order),
          shift_(2 * (Moc::deepest_order - order)) {}

    void begin_at(const Direction& draw) { visit(cell_at((to_icrs_ * draw).normalized())); }

    std::vector<Moc::Range> grown() {
        // Neighbours lie within 1.1 cell sides of the centre in some of 16 directions.
        const double side = std::sqrt(std::numbers::pi / 3.0) / std::ldexp(1.0, order_);
        while (!edge_.empty()) {
            const Direction centre = centre_of_nested(edge_.front(), order_);
            edge_.pop_front();
            const Direction across = centre.unitOrthogonal(), up = centre.cross(across);
            for (int step = 0; step < 16; ++step) {
                const double angle = std::numbers::pi * step / 8.0;
                visit(
                    cell_at((centre + side * (std::cos(angle) * across + std::sin(angle) * up))
                                .normalized()));
            }
        }
        std::vector<Moc::Range> ranges;
        for (const std::int64_t cell : inside_)
            ranges.push_back({cell << shift_, (cell + 1) << shift_});
        return ranges;
    }

  private:
    std::int64_t cell_at(const Direction& direction) const {
        return deepest_pixel_at(direction) >> shift_;
    }
    void visit(std::int64_t cell) {
        if (!seen_.insert(cell).second) return;
        if (density_.at(to_icrs_.transpose() * centre_of_nested(cell, order_)) < level_) return;
        inside_.push_back(cell);
        edge_.push_back(cell);
    }

    const DirectionDensity& density_;
    double level_;
    Eigen::Matrix3d to_icrs_;
    int order_, shift_;
    std::unordered_set<std::int64_t> seen_;
    std::vector<std::int64_t> inside_;
    std::deque<std::int64_t> edge_;
};

}  // namespace

std::vector<double> direction_probability(const DirectionDensity& density,
                                          const std::vector<Direction>& draws,
                                          Frame job_frame,
                                          Frame frame,
                                          int nside) {
    const Pixelisation grid(nside);
    const Eigen::Matrix3d to_map = rotation(job_frame, frame);
    const double pixel_deg2 = full_sky_deg2 / static_cast<double>(grid.n_pixels());
    if (density.area_deg2(level68) < std::numbers::pi * 4.0 * pixel_deg2)
        return shares_of(draws, to_map, grid);
    std::vector<double> probability;
    double sum = 0.0;
    for (std::int64_t pixel = 0; pixel < grid.n_pixels(); ++pixel) {
        probability.push_back(density.at(to_map.transpose() * grid.centre(pixel)));
        sum += probability.back();
    }
    for (double& share : probability) share /= sum;
    return probability;
}

Moc region_moc(const DirectionDensity& density,
               const std::vector<Direction>& draws,
               Frame job_frame,
               double probability) {
    constexpr double cells_wanted = 5000.0;
    const double area = std::max(density.area_deg2(probability), 1e-12);
    const double order = 0.5 * std::log2(cells_wanted / 12.0 * full_sky_deg2 / area);
    CellRegion region(density,
                      density.level(probability),
                      rotation(job_frame, Frame::icrs),
                      std::clamp(static_cast<int>(std::ceil(order)), 4, 29));
    for (const Direction& draw : draws) region.begin_at(draw);
    auto ranges = region.grown();
    return ranges.empty() ? Moc() : Moc(std::move(ranges));
}

std::vector<std::string> write_sky_files(const SkyFileSource& source,
                                         const std::filesystem::path& folder) {
    std::vector<std::string> names;
    const DrawRows rows = rows_of(source.chain.draws);
    for (std::size_t index = 0; index < source.directions.size(); ++index) {
        if (!source.directions[index]) continue;
        const Directions directions = directions_of(rows, source.chain.vectors[index].first);
        write_maps(source, index, directions.unit, folder, names);
        write_regions(source, index, directions.unit, folder, names);
    }
    const Counts& counts = source.chain.counts;
    for (std::size_t survey = 0; survey < counts.surveys.size(); ++survey) {
        names.push_back(fmt::format("residuals-{}.fits", counts.surveys[survey].name));
        ResidualMap map = residual_map(source.chain, source.space, survey, counts.nside);
        write_healpix_map(folder / names.back(),
                          {counts.nside, counts.frame, std::move(map.residual)},
                          "RESIDUAL");
    }
    return names;
}

}  // namespace deviascope
