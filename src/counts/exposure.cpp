// SPDX-License-Identifier: GPL-2.0-or-later
#include "counts/exposure.h"

#include <fmt/format.h>

#include <algorithm>
#include <cmath>
#include <utility>

#include "counts/map_frame.h"
#include "deviascope/core/error.h"

namespace deviascope {

namespace {

/// Absent becomes 0; what is no exposure is refused.
std::vector<double> checked(const std::filesystem::path& path, std::vector<double> value) {
    for (std::size_t pixel = 0; pixel < value.size(); ++pixel) {
        if (std::isnan(value[pixel])) value[pixel] = 0.0;
        if (value[pixel] >= 0.0 && value[pixel] <= 1.0) continue;
        throw InputError({fmt::format("{}: pixel {} (RING)", path.string(), pixel),
                          fmt::format("the exposure is {}", value[pixel]),
                          "0 … 1",
                          "divide the map by its largest value, or correct it"});
    }
    return value;
}

/// Mean over the sub-pixels of one pixel, in NESTED order.
double mean_exposure(const ExposureProduct& maps,
                     const std::vector<std::int64_t>& cells,
                     const Pixelisation& fine) {
    double sum = 0.0;
    for (const std::int64_t cell : cells) {
        double product = 1.0;
        for (const ExposureMap* map : maps) product *= map->in_cell(cell, fine);
        sum += product;
    }
    return sum / static_cast<double>(cells.size());
}

/// nside of the sub-pixels over which the product of the maps is averaged.
int nside_of_sub_pixels(const ExposureProduct& maps, const Pixelisation& grid) {
    int nside = grid.nside();
    for (const ExposureMap* map : maps)
        nside = std::max(nside, map->is_in_job_frame() ? map->nside() : 4 * grid.nside());
    return nside;
}

}  // namespace

ExposureMap::ExposureMap(const std::filesystem::path& path,
                         std::optional<Frame> map_frame,
                         Frame job_frame)
    : path_(path), cells_(1) {
    HealpixMap map = read_healpix_map(path);
    const Frame frame = frame_of_map(path, map, map_frame);
    in_job_frame_ = frame == job_frame;
    to_map_ = rotation(job_frame, frame);
    cells_ = Pixelisation(map.nside);
    value_ = checked(path, std::move(map.value));
}

double ExposureMap::at(const Direction& direction) const {
    const Direction in_map = in_job_frame_ ? direction : Direction(to_map_ * direction);
    return value_[static_cast<std::size_t>(cells_.pixel_at(in_map))];
}

void ExposureMap::mark_zero(std::span<const Direction> directions, std::span<char> zero) const {
    std::vector<Direction> in_map(directions.begin(), directions.end());
    if (!in_job_frame_)
        for (Direction& direction : in_map) direction = to_map_ * direction;
    std::vector<std::int64_t> cell(in_map.size());
    cells_.pixels_at(in_map, cell);
    for (std::size_t i = 0; i < cell.size(); ++i)
        if (value_[static_cast<std::size_t>(cell[i])] == 0.0) zero[i] = 1;
}

double ExposureMap::in_cell(std::int64_t cell, const Pixelisation& cells) const {
    if (!in_job_frame_) return at(cells.centre(cell));
    const std::int64_t own = cells.nside() == nside() ? cell : cells.parent(cell, cells_);
    return value_[static_cast<std::size_t>(own)];
}

std::vector<double> exposure_on_grid(const ExposureProduct& maps, const Pixelisation& grid) {
    std::vector<double> exposure(static_cast<std::size_t>(grid.n_pixels()), 1.0);
    if (maps.empty()) return exposure;
    const Pixelisation fine(nside_of_sub_pixels(maps, grid));
    for (std::size_t pixel = 0; pixel < exposure.size(); ++pixel) {
        const auto number = static_cast<std::int64_t>(pixel);
        const std::vector<std::int64_t> cells = fine.nside() == grid.nside()
                                                    ? std::vector<std::int64_t>{number}
                                                    : grid.children(number, fine);
        exposure[pixel] = mean_exposure(maps, cells, fine);
    }
    return exposure;
}

bool has_structure_inside_pixels(const ExposureProduct& maps, const Pixelisation& grid) {
    return std::ranges::any_of(maps, [&](const ExposureMap* map) {
        return !map->is_in_job_frame() || map->nside() > grid.nside();
    });
}

void find_unexposed(const ExposureProduct& maps,
                    std::span<const Direction> directions,
                    std::span<char> unexposed) {
    std::ranges::fill(unexposed, char{0});
    for (const ExposureMap* map : maps) map->mark_zero(directions, unexposed);
}

}  // namespace deviascope
