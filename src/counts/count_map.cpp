// SPDX-License-Identifier: GPL-2.0-or-later
#include "deviascope/counts/count_map.h"

#include <numeric>

namespace deviascope {

double Footprint::sky_fraction(const Pixelisation& grid) const {
    return static_cast<double>(pixel.size()) / static_cast<double>(grid.n_pixels());
}

double Footprint::exposed_solid_angle(const Pixelisation& grid) const {
    const long double sum = std::accumulate(exposure.begin(), exposure.end(), 0.0L);
    return static_cast<double>(sum * static_cast<long double>(grid.solid_angle()));
}

std::int64_t BinCounts::total() const {
    return std::accumulate(count.begin(), count.end(), std::int64_t{0});
}

}  // namespace deviascope
