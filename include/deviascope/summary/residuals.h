// SPDX-License-Identifier: GPL-2.0-or-later
// chain -> SUMMARY -> figures
#pragma once

#include <cstdint>
#include <vector>

#include "deviascope/chain/chain.h"
#include "deviascope/model/parameter_space.h"

namespace deviascope {

/// What a survey's counts leave over, all its bins together, on a HEALPix grid (RING).
struct ResidualMap {
    int nside = 1;
    std::vector<double> counted, expected;  ///< sources a cell; 0 where nothing was kept
    /// (counted - expected) / sqrt(variance), variance = sum over bins of dispersion x
    /// expected; NaN where nothing was kept.
    std::vector<double> residual;
    double chi_squared = 0.0;  ///< sum of squares
    std::int64_t n_cells = 0;  ///< that are not NaN
    double largest = 0.0;      ///< residual of largest size
};

/// Expected: at the mean row of the chain, summed over the kept pixels of each cell.
/// @param nside  at most that of the counts
ResidualMap residual_map(const Chain& chain,
                         const ParameterSpace& space,
                         std::size_t survey,
                         int nside);

}  // namespace deviascope
