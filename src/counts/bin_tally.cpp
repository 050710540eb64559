// SPDX-License-Identifier: GPL-2.0-or-later
#include "counts/bin_tally.h"

#include <fmt/format.h>

#include "deviascope/core/error.h"

namespace deviascope {

std::vector<std::uint32_t> BinTally::on(const Footprint& footprint) const {
    std::vector<std::uint32_t> out;
    out.reserve(footprint.pixel.size());
    for (const std::int64_t pixel : footprint.pixel)
        out.push_back(count_[static_cast<std::size_t>(pixel)]);
    return out;
}

void BinTally::refuse(std::int64_t pixel) const {
    throw InputError({fmt::format("{}: pixel {}", place_, pixel),
                      fmt::format("there are more than {} sources in one pixel", UINT32_MAX),
                      fmt::format("at most {} a pixel", UINT32_MAX),
                      "choose a larger nside"});
}

}  // namespace deviascope
