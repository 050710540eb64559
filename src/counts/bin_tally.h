// SPDX-License-Identifier: GPL-2.0-or-later
// COUNTS (private): sources per pixel of one bin, while they are being counted
#pragma once

#include <cstdint>
#include <string>
#include <vector>

#include "deviascope/counts/count_map.h"

namespace deviascope {

/// Counts of one bin over the full grid.
class BinTally {
  public:
    /// @param place  for messages: `survey dunlin, bin faint`
    BinTally(std::string place, const Pixelisation& grid)
        : place_(std::move(place)), count_(static_cast<std::size_t>(grid.n_pixels())) {}

    /// Adds n >= 0 sources to a pixel. Errors: InputError beyond 2^32 - 1 in a pixel.
    void add(std::int64_t pixel, std::int64_t n = 1) {
        std::uint32_t& count = count_[static_cast<std::size_t>(pixel)];
        if (n > std::int64_t{UINT32_MAX} - std::int64_t{count}) refuse(pixel);
        count += static_cast<std::uint32_t>(n);
    }
    /// The counts of the pixels of a footprint.
    std::vector<std::uint32_t> on(const Footprint& footprint) const;
    const std::string& place() const { return place_; }

  private:
    [[noreturn]] void refuse(std::int64_t pixel) const;

    std::string place_;
    std::vector<std::uint32_t> count_;
};

}  // namespace deviascope
