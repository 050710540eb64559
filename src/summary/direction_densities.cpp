// SPDX-License-Identifier: GPL-2.0-or-later
#include "deviascope/summary/direction_densities.h"

#include "deviascope/core/parallel.h"
#include "deviascope/summary/draw_values.h"

namespace deviascope {

std::vector<std::optional<DirectionDensity>> direction_densities(const Chain& chain,
                                                                 const Summary& summary,
                                                                 int threads) {
    std::vector<std::optional<DirectionDensity>> densities(chain.vectors.size());
    const DrawRows rows = rows_of(chain.draws);
    parallel_for(densities.size(), threads, [&](std::size_t index) {
        const VectorParameter& vector = chain.vectors[index];
        if (!vector.direction_free) return;
        const Directions directions = directions_of(rows, vector.first);
        if (directions.unit.empty()) return;
        densities[index].emplace(
            directions.unit,
            effective_directions(vector, summary.sampling.scalars, chain.draws));
    });
    return densities;
}

}  // namespace deviascope
