// SPDX-License-Identifier: GPL-2.0-or-later
#include "counts/exposure.h"

#include <fmt/format.h>

#include <algorithm>
#include <bit>
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
    std::optional<MocFile> moc;
    HealpixMap map;
    if (is_moc(path)) {
        moc = read_moc(path);
        if (!moc->frame && !map_frame) moc->frame = Frame::icrs;
    } else {
        map = read_healpix_map(path);
    }
    const Frame frame = frame_of_map(path, moc ? moc->frame : map.frame, map_frame);
    in_job_frame_ = frame == job_frame;
    to_map_ = rotation(job_frame, frame);
    moc ? take_region(*moc) : take_map(std::move(map));
}

void ExposureMap::take_region(const MocFile& file) {
    constexpr int largest_order = 10;
    region_ = file.region;
    order_ = region_->order();
    cells_ = Pixelisation(1 << std::min(order_, largest_order));
}

void ExposureMap::take_map(HealpixMap map) {
    cells_ = Pixelisation(map.nside);
    order_ = std::countr_zero(static_cast<unsigned>(map.nside));
    value_ = checked(path_, std::move(map.value));
}

bool ExposureMap::is_finer_than(const Pixelisation& grid) const {
    return !in_job_frame_ || order_ > std::countr_zero(static_cast<unsigned>(grid.nside()));
}

Direction ExposureMap::in_map(const Direction& direction) const {
    return in_job_frame_ ? direction : Direction(to_map_ * direction);
}

double ExposureMap::at(const Direction& direction) const {
    if (region_) return region_->contains(in_map(direction)) ? 1.0 : 0.0;
    return value_[static_cast<std::size_t>(cells_.pixel_at(in_map(direction)))];
}

void ExposureMap::mark_zero(std::span<const Direction> directions, std::span<char> zero) const {
    if (region_) {
        for (std::size_t i = 0; i < directions.size(); ++i)
            if (!region_->contains(in_map(directions[i]))) zero[i] = 1;
        return;
    }
    std::vector<Direction> rotated(directions.begin(), directions.end());
    if (!in_job_frame_)
        for (Direction& direction : rotated) direction = to_map_ * direction;
    std::vector<std::int64_t> cell(rotated.size());
    cells_.pixels_at(rotated, cell);
    for (std::size_t i = 0; i < cell.size(); ++i)
        if (value_[static_cast<std::size_t>(cell[i])] == 0.0) zero[i] = 1;
}

double ExposureMap::in_cell(std::int64_t cell, const Pixelisation& cells) const {
    if (!in_job_frame_) return at(cells.centre(cell));
    if (region_)
        return region_->share_of(cells.nested_of_ring(cell),
                                 std::countr_zero(static_cast<unsigned>(cells.nside())));
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
    return std::ranges::any_of(
        maps, [&](const ExposureMap* map) { return map->is_finer_than(grid); });
}

void find_unexposed(const ExposureProduct& maps,
                    std::span<const Direction> directions,
                    std::span<char> unexposed) {
    std::ranges::fill(unexposed, char{0});
    for (const ExposureMap* map : maps) map->mark_zero(directions, unexposed);
}

}  // namespace deviascope
