// SPDX-License-Identifier: GPL-2.0-or-later
// SKY (private): pixels of many directions at once
#pragma once

#include <array>
#include <cstddef>

namespace deviascope {

/// Directions searched together, and what was found.
struct SearchBlock {
    static constexpr std::size_t capacity = 256;  // the block stays in the first-level cache
    using Lane = std::array<double, capacity>;

    std::size_t n = 0;   ///< directions in the block
    Lane x{}, y{}, z{};  ///< their components
    Lane pixel{};        ///< RING pixel numbers (whole numbers); valid where `edge` says so
    /// 0 in the middle between all lines where the answer could change, 0.5 on one; not below
    /// 0.5 (perhaps NaN) where the direction is no unit vector or the search does not apply.
    Lane edge{};
};

/// Finds the RING pixels of a block of unit vectors.
///
/// The steps are those of HEALPix (Gorski et al. 2005, ApJ 622, 759: a pixel is bounded by an
/// ascending and a descending line, and the answer is the whole part of a few real numbers),
/// without branches, so that they run several at a time. Longitude comes from a polynomial: the
/// real numbers differ from HEALPix's by up to 5e-13 nside.
/// Where `edge < search_limit(nside)` whole parts cannot differ, and the pixel is HEALPix's own
/// for the same direction; everywhere else HEALPix must be asked.
void search(SearchBlock& block, int nside);

/// 0.5 less 2,000 times the error of the real numbers.
constexpr double search_limit(int nside) {
    return 0.5 - 1e-9 * (1.0 + nside);
}

}  // namespace deviascope
