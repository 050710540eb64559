// SPDX-License-Identifier: GPL-2.0-or-later
// MODEL, private: moments as the moment engine reads them
#pragma once

#include <Eigen/Core>
#include <cstddef>
#include <vector>

#include "deviascope/counts/count_map.h"
#include "deviascope/model/parameter_space.h"

namespace deviascope {

/// One bin of a group.
struct MomentBin {
    std::size_t term = 0;     ///< index into ParameterSpace::terms()
    Eigen::Index weight = 0;  ///< index of its kinematic weight in a row of parameters
    double sources = 0.0;     ///< N
};

/// The bins that share an exposure map, an intrinsic dipole and a bias ratio. Coefficients are
/// moments times the multinomial factor of their monomial, so that sums over the monomials of
/// degree k give <(v.n)^k> and the like.
struct MomentGroup {
    Eigen::Index intrinsic = 0;  ///< index of the dipole's x component in a row of parameters
    double bias_ratio = 1.0;
    std::vector<MomentBin> bins;
    std::size_t n_padded = 0;  ///< bins, filled up to whole chunks

    /// monomial x 4: <n^m>, <nx n^m>, <ny n^m>, <nz n^m> over the exposure, degrees 0 … 8
    std::vector<double> exposure;
    /// monomial x n_padded: dP_m / degree, degrees 1 … 8 (0 at degree 0)
    std::vector<double> excess;
};

/// Bins are worked on this many at a time.
inline constexpr std::size_t bins_per_chunk = 4;

/// @param counts  with moments
std::vector<MomentGroup> make_moment_groups(const Counts& counts, const ParameterSpace& space);

}  // namespace deviascope
