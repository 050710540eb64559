// SPDX-License-Identifier: GPL-2.0-or-later
#include "deviascope/sky/pixelisation.h"

#include <healpix_base.h>

#include <algorithm>
#include <bit>
#include <cmath>
#include <numbers>

#include "deviascope/core/error.h"
#include "sky/pixel_search.h"

namespace deviascope {

namespace {

// The library throws what is no std::exception, and prints before it does; every argument is
// therefore checked before it gets there.
using Cells = T_Healpix_Base<std::int64_t>;

Direction to_direction(const vec3& v) {
    return {v.x, v.y, v.z};
}

bool is_unit(const Direction& direction) {
    return std::abs(direction.squaredNorm() - 1.0) < 1e-6;  // false for NaN
}

std::int64_t pixel_of(const Cells& cells, const Direction& direction) {
    ensure(is_unit(direction), "a direction is a unit vector");
    return cells.vec2pix({direction.x(), direction.y(), direction.z()});
}

SearchBlock& fill(SearchBlock& block, std::span<const Direction> directions) {
    block.n = directions.size();
    for (std::size_t lane = 0; lane < block.n; ++lane) {
        block.x[lane] = directions[lane].x();
        block.y[lane] = directions[lane].y();
        block.z[lane] = directions[lane].z();
    }
    return block;
}

std::int64_t ratio_of(const Pixelisation& fine, const Pixelisation& coarse) {
    ensure(fine.nside() >= coarse.nside(), "a finer grid has a larger nside");
    const std::int64_t ratio = fine.nside() / coarse.nside();
    return ratio * ratio;
}

}  // namespace

Pixelisation::Pixelisation(int nside)
    : nside_(nside), order_(std::countr_zero(static_cast<unsigned>(nside))) {
    ensure(is_valid_nside(nside), "nside is a power of two, 1 to 8192");
}

bool Pixelisation::is_valid_nside(std::int64_t nside) {
    return nside >= 1 && nside <= max_nside && std::has_single_bit(std::uint64_t(nside));
}

double Pixelisation::solid_angle() const {
    return 4.0 * std::numbers::pi / double(n_pixels());
}

std::int64_t Pixelisation::pixel_at(const Direction& direction) const {
    return pixel_of(Cells(order_, RING), direction);
}

void Pixelisation::pixels_at(std::span<const Direction> directions,
                             std::span<std::int64_t> pixels) const {
    ensure(directions.size() == pixels.size(), "one pixel is wanted for each direction");
    const Cells cells(order_, RING);
    SearchBlock block;
    for (std::size_t first = 0; first < directions.size(); first += SearchBlock::capacity) {
        const std::size_t n = std::min(SearchBlock::capacity, directions.size() - first);
        search(fill(block, directions.subspan(first, n)), nside_);
        for (std::size_t lane = 0; lane < n; ++lane) {
            pixels[first + lane] = block.edge[lane] < search_limit(nside_)
                                       ? std::int64_t(block.pixel[lane])
                                       : pixel_of(cells, directions[first + lane]);
        }
    }
}

Direction Pixelisation::centre(std::int64_t pixel) const {
    ensure(pixel >= 0 && pixel < n_pixels(), "a pixel number lies inside the grid");
    return to_direction(Cells(order_, RING).pix2vec(pixel));
}

std::vector<Direction> Pixelisation::centres() const {
    const Cells cells(order_, RING);
    std::vector<Direction> all(static_cast<std::size_t>(n_pixels()));
    std::int64_t pixel = 0;
    for (Direction& direction : all) direction = to_direction(cells.pix2vec(pixel++));
    return all;
}

std::int64_t Pixelisation::ring_of_nested(std::int64_t nested) const {
    ensure(nested >= 0 && nested < n_pixels(), "a pixel number lies inside the grid");
    return Cells(order_, RING).nest2ring(nested);
}

std::int64_t Pixelisation::nested_of_ring(std::int64_t ring) const {
    ensure(ring >= 0 && ring < n_pixels(), "a pixel number lies inside the grid");
    return Cells(order_, RING).ring2nest(ring);
}

std::vector<std::int64_t> Pixelisation::children(std::int64_t pixel,
                                                 const Pixelisation& fine) const {
    const std::int64_t ratio = ratio_of(fine, *this);
    const std::int64_t first = nested_of_ring(pixel) * ratio;
    std::vector<std::int64_t> inside;
    inside.reserve(static_cast<std::size_t>(ratio));
    for (std::int64_t nested = first; nested < first + ratio; ++nested)
        inside.push_back(fine.ring_of_nested(nested));
    return inside;
}

std::int64_t Pixelisation::parent(std::int64_t pixel, const Pixelisation& coarse) const {
    return coarse.ring_of_nested(nested_of_ring(pixel) / ratio_of(*this, coarse));
}

}  // namespace deviascope
