// SPDX-License-Identifier: GPL-2.0-or-later
// MODEL, private: the map as the pixel engine reads it
#pragma once

#include <Eigen/Core>
#include <cstddef>
#include <cstdint>
#include <vector>

#include "deviascope/counts/count_map.h"
#include "deviascope/model/parameter_space.h"

namespace deviascope {

/// An exposure map, padded with zeros to whole pixel blocks.
struct ExposureTable {
    const Footprint* footprint = nullptr;  ///< what it was made from; not read later
    std::vector<double> value;
    double sum = 0.0;
};

/// The counts of a bin, padded with zeros to whole pixel blocks.
struct BinTable {
    Eigen::Index term = 0;     ///< index into ParameterSpace::terms()
    Eigen::Index weight = 0;   ///< index of its kinematic weight in a row of parameters
    std::size_t exposure = 0;  ///< index into SkyTable::exposures
    std::vector<std::int32_t> count;
    double sources = 0.0;  ///< N_b
};

/// The bins that feel the same intrinsic vector with the same bias ratio.
struct DipoleTable {
    Eigen::Index intrinsic = 0;  ///< index of its x component in a row of parameters
    double bias_ratio = 1.0;
    std::vector<BinTable> bins;
};

/// Bins whose kept pixels are the same: ln(1 - beta.n) is common to them.
struct SkyTable {
    const Footprint* footprint = nullptr;  ///< one that has these pixels; not read later
    std::vector<double> x, y, z;           ///< centres, padded with zeros
    std::vector<ExposureTable> exposures;
    std::vector<DipoleTable> dipoles;

    std::size_t n_padded() const { return x.size(); }
    std::size_t n_bins() const;
};

/// Sorts the bins by what they share. Errors: InputError where a pixel holds more than 2^31 - 1
/// sources.
std::vector<SkyTable> make_sky_tables(const Counts& counts, const ParameterSpace& space);

}  // namespace deviascope
