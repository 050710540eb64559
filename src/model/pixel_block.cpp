// SPDX-License-Identifier: GPL-2.0-or-later
#include "model/pixel_block.h"

#include "core/lanes.h"
#include "model/elementary.h"

namespace deviascope {
namespace {

using elementary::Reach;

// A block is summed as a binary tree whose upper half is folded onto the lower again and again.
// The two highest levels are taken in registers, by evaluating four pixels at a time.
constexpr std::size_t quarter = block_size / 4;
using QuarterBlock = double[quarter];

/// ((v0 + v2) + (v1 + v3)) of the four quarters.
[[gnu::always_inline]] inline double fold(double v0, double v1, double v2, double v3) {
    return (v0 + v2) + (v1 + v3);
}

template <std::size_t n>
[[gnu::always_inline]] inline void fold_to(double* __restrict values) {
    for (std::size_t p = 0; p < n; ++p)
        values[p] = fold(values[p], values[p + n], values[p + 2 * n], values[p + 3 * n]);
}

/// The remaining levels.
[[gnu::always_inline]] inline double sum_of(QuarterBlock& values) {
    static_assert(quarter == 128);
    fold_to<32>(values);
    fold_to<8>(values);
    return fold(values[0], values[2], values[4], values[6]) +
           fold(values[1], values[3], values[5], values[7]);
}

template <Reach reach>
[[gnu::always_inline]] inline void fill_log1p(const PixelCentres& centres,
                                              std::size_t first,
                                              const std::array<double, 3>& vector,
                                              double* __restrict out) {
    const double* __restrict x = centres.x + first;
    const double* __restrict y = centres.y + first;
    const double* __restrict z = centres.z + first;
    const double vx = vector[0], vy = vector[1], vz = vector[2];
    for (std::size_t p = 0; p < block_size; ++p)
        out[p] = elementary::log1p<reach>(vx * x[p] + vy * y[p] + vz * z[p]);
}

/// ln(1 + v.n_p) of a block.
[[gnu::always_inline]] inline void log1p_of_block(const PixelCentres& centres,
                                                  std::size_t first,
                                                  const std::array<double, 3>& vector,
                                                  double* __restrict out) {
    constexpr auto squared_bound = [](double bound) { return bound * bound * (1.0 - 1e-12); };
    const double squared =
        vector[0] * vector[0] + vector[1] * vector[1] + vector[2] * vector[2];
    if (squared < squared_bound(elementary::small_bound))
        fill_log1p<Reach::small>(centres, first, vector, out);
    else if (squared < squared_bound(elementary::log1p_near_bound))
        fill_log1p<Reach::near>(centres, first, vector, out);
    else
        fill_log1p<Reach::far>(centres, first, vector, out);
}

template <Reach reach>
[[gnu::always_inline]] inline PixelSums sums_with(const double* __restrict log_kinematic,
                                                  const double* __restrict log_intrinsic,
                                                  const BinOfWalker& bin,
                                                  std::size_t first) {
    alignas(64) QuarterBlock counted;
    alignas(64) QuarterBlock exposed;
    const double* __restrict exposure = bin.exposure + first;
    const std::int32_t* __restrict count = bin.count + first;
    const double weight = bin.weight;
    const auto terms_at = [=](std::size_t p) __attribute__((always_inline)) {
        const double y = log_intrinsic[p] - weight * log_kinematic[p];
        return PixelSums{static_cast<double>(count[p]) * y,
                         exposure[p] * elementary::expm1<reach>(y)};
    };
    for (std::size_t p = 0; p < quarter; ++p) {
        const PixelSums t0 = terms_at(p);
        const PixelSums t1 = terms_at(p + quarter);
        const PixelSums t2 = terms_at(p + 2 * quarter);
        const PixelSums t3 = terms_at(p + 3 * quarter);
        counted[p] = fold(t0.counted, t1.counted, t2.counted, t3.counted);
        exposed[p] = fold(t0.exposed, t1.exposed, t2.exposed, t3.exposed);
    }
    PixelSums sums;
    sums.counted = sum_of(counted);
    sums.exposed = sum_of(exposed);
    return sums;
}

[[gnu::always_inline]] inline PixelSums sums_of_bin(const double* __restrict log_kinematic,
                                                    const double* __restrict log_intrinsic,
                                                    const BinOfWalker& bin,
                                                    std::size_t first) {
    if (bin.furthest < elementary::tiny_bound)
        return sums_with<Reach::tiny>(log_kinematic, log_intrinsic, bin, first);
    if (bin.furthest < elementary::small_bound)
        return sums_with<Reach::small>(log_kinematic, log_intrinsic, bin, first);
    if (bin.furthest < elementary::expm1_near_bound)
        return sums_with<Reach::near>(log_kinematic, log_intrinsic, bin, first);
    return sums_with<Reach::far>(log_kinematic, log_intrinsic, bin, first);
}

DEVIASCOPE_WIDEST_INSTRUCTIONS
void sum_block_widest(const PixelCentres& centres,
                      std::size_t first,
                      const WalkerOnSky& walker,
                      PixelSums* next) {
    alignas(64) double log_kinematic[block_size];
    alignas(64) double log_intrinsic[block_size];
    log1p_of_block(centres, first, walker.receding, log_kinematic);
    for (const DipoleOfWalker& dipole : walker.dipoles) {
        log1p_of_block(centres, first, dipole.vector, log_intrinsic);
        for (const BinOfWalker& bin : dipole.bins)
            *next++ = sums_of_bin(log_kinematic, log_intrinsic, bin, first);
    }
}

}  // namespace

void sum_block(const PixelCentres& centres,
               std::size_t first,
               const WalkerOnSky& walker,
               std::span<PixelSums> sums) {
    sum_block_widest(centres, first, walker, sums.data());
}

}  // namespace deviascope
