// SPDX-License-Identifier: GPL-2.0-or-later
// MODEL, private: the sums of one walker over one block of pixels
#pragma once

#include <array>
#include <cstddef>
#include <cstdint>
#include <span>

namespace deviascope {

/// Pixels summed together. A power of two: sums inside a block are pairwise, in the order of a
/// binary tree, so that they do not depend on the width of the processor's registers.
inline constexpr std::size_t block_size = 512;

/// sum_p n_p y_p and sum_p w_p expm1(y_p).
struct PixelSums {
    double counted = 0.0;
    double exposed = 0.0;
};

/// Centres of a sky's pixels; the last block is padded with zero vectors.
struct PixelCentres {
    const double* x = nullptr;
    const double* y = nullptr;
    const double* z = nullptr;
};

/// One bin of one walker: y_p = -weight ln(1 - beta.n_p) + ln(1 + r D.n_p), without ln gamma.
struct BinOfWalker {
    const double* exposure = nullptr;     ///< w; zero in the padding
    const std::int32_t* count = nullptr;  ///< n; zero in the padding
    double weight = 0.0;
    double furthest = 0.0;  ///< bound of |y|: chooses the series of expm1
};

/// The bins that feel the same dipole r D.
struct DipoleOfWalker {
    std::array<double, 3> vector{};  ///< r D, length below 1
    std::span<const BinOfWalker> bins;
};

/// What one walker asks of one sky. Whatever it holds is a function of the walker alone.
struct WalkerOnSky {
    std::array<double, 3> receding{};  ///< -beta, length below 1
    std::span<const DipoleOfWalker> dipoles;
};

/// Sums over the pixels first … first + block_size - 1.
/// @param first  a multiple of block_size
/// @param sums   one entry a bin, in the order of the dipoles and their bins
void sum_block(const PixelCentres& centres,
               std::size_t first,
               const WalkerOnSky& walker,
               std::span<PixelSums> sums);

}  // namespace deviascope
