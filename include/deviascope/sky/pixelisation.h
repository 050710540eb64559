// SPDX-License-Identifier: GPL-2.0-or-later
// SKY: where things are, no sources; the only place that knows the HEALPix library
#pragma once

#include <cstdint>
#include <span>
#include <vector>

#include "deviascope/sky/direction.h"

namespace deviascope {

/// HEALPix cells of one resolution (Gorski et al. 2005, ApJ 622, 759). Pixel numbers are RING
/// ordered everywhere inside the program.
class Pixelisation {
  public:
    static constexpr int max_nside = 8192;  ///< for maps read; a job allows 1 … 1024

    /// Errors: InternalError unless nside is a power of two, 1 … max_nside (callers check
    /// input).
    explicit Pixelisation(int nside);
    static bool is_valid_nside(std::int64_t nside);

    int nside() const { return nside_; }
    std::int64_t n_pixels() const { return 12LL * nside_ * nside_; }
    /// 4 pi / n_pixels, steradian.
    double solid_angle() const;

    /// Pixel that holds a direction. Errors: InternalError unless it is a unit vector to 1e-6.
    std::int64_t pixel_at(const Direction& direction) const;
    /// The same for many, and the same numbers, several times faster; both spans have the same
    /// length.
    void pixels_at(std::span<const Direction> directions, std::span<std::int64_t> pixels) const;
    /// Centre of a pixel. Its z component is HEALPix's own z, exact on rings.
    Direction centre(std::int64_t pixel) const;
    /// Centres of all pixels, in RING order.
    std::vector<Direction> centres() const;

    std::int64_t ring_of_nested(std::int64_t nested) const;
    std::int64_t nested_of_ring(std::int64_t ring) const;

    /// The pixels of the finer grid `fine` (nside a multiple of ours) inside one of our pixels,
    /// RING numbers, in NESTED order.
    std::vector<std::int64_t> children(std::int64_t pixel, const Pixelisation& fine) const;
    /// The pixel of the coarser grid `coarse` that holds one of our pixels.
    std::int64_t parent(std::int64_t pixel, const Pixelisation& coarse) const;

  private:
    int nside_;
    int order_;
};

}  // namespace deviascope
