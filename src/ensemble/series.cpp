// SPDX-License-Identifier: GPL-2.0-or-later
#include "ensemble/series.h"

#include <algorithm>

namespace deviascope {

SeriesShape series_shape(Eigen::Index n_replicates, Eigen::Index n_walkers) {
    return {n_replicates, n_walkers, std::min(n_walkers, walkers_looked_at)};
}

void append_series(const MonitoredScalar& scalar,
                   const Draws& draws,
                   Eigen::Index first_row,
                   Eigen::Index last_row,
                   LargeArray& series) {
    const SeriesShape shape = series_shape(draws.n_replicates, draws.n_walkers);
    std::size_t place = series.size();
    series.resize(place + static_cast<std::size_t>((last_row - first_row) * shape.n_chains()));
    for (Eigen::Index row = first_row; row < last_row; ++row)
        for (Eigen::Index replicate = 0; replicate < shape.n_replicates; ++replicate)
            for (Eigen::Index walker = 0; walker < shape.n_looked; ++walker)
                series[place++] = scalar.value(draws.row_of(row, replicate, walker));
}

}  // namespace deviascope
