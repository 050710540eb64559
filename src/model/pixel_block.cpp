// SPDX-License-Identifier: GPL-2.0-or-later
#include "model/pixel_block.h"

#include "model/elementary.h"

namespace deviascope {
namespace {

using elementary::Reach;

/// Folds the upper half onto the lower until one value is left: a pairwise sum.
[[gnu::always_inline]] inline double tree_sum(double* __restrict values) {
    for (std::size_t half = block_size / 2; half >= 8; half /= 2)
        for (std::size_t p = 0; p < half; ++p) values[p] += values[p + half];
    return ((values[0] + values[4]) + (values[2] + values[6])) +
           ((values[1] + values[5]) + (values[3] + values[7]));
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
    constexpr double bound = elementary::log1p_near * elementary::log1p_near * (1.0 - 1e-12);
    const double squared =
        vector[0] * vector[0] + vector[1] * vector[1] + vector[2] * vector[2];
    if (squared < bound)
        fill_log1p<Reach::near>(centres, first, vector, out);
    else
        fill_log1p<Reach::far>(centres, first, vector, out);
}

struct SmallExpm1 {
    [[gnu::always_inline]] inline double operator()(double y) const {
        return elementary::expm1_small(y);
    }
};
template <Reach reach>
struct Expm1 {
    [[gnu::always_inline]] inline double operator()(double y) const {
        return elementary::expm1<reach>(y);
    }
};

template <typename Function>
[[gnu::always_inline]] inline PixelSums sums_with(const double* __restrict log_kinematic,
                                                  const double* __restrict log_intrinsic,
                                                  const BinOfWalker& bin,
                                                  std::size_t first,
                                                  Function expm1) {
    alignas(64) double counted[block_size];
    alignas(64) double exposed[block_size];
    const double* __restrict exposure = bin.exposure + first;
    const std::int32_t* __restrict count = bin.count + first;
    const double weight = bin.weight;
    for (std::size_t p = 0; p < block_size; ++p) {
        const double y = log_intrinsic[p] - weight * log_kinematic[p];
        counted[p] = static_cast<double>(count[p]) * y;
        exposed[p] = exposure[p] * expm1(y);
    }
    PixelSums sums;
    sums.counted = tree_sum(counted);
    sums.exposed = tree_sum(exposed);
    return sums;
}

[[gnu::always_inline]] inline PixelSums sums_of_bin(const double* __restrict log_kinematic,
                                                    const double* __restrict log_intrinsic,
                                                    const BinOfWalker& bin,
                                                    std::size_t first) {
    if (bin.furthest < elementary::expm1_small_reach)
        return sums_with(log_kinematic, log_intrinsic, bin, first, SmallExpm1{});
    if (bin.furthest < elementary::expm1_near)
        return sums_with(log_kinematic, log_intrinsic, bin, first, Expm1<Reach::near>{});
    return sums_with(log_kinematic, log_intrinsic, bin, first, Expm1<Reach::far>{});
}

// Compiled for several instruction sets; the widest that the processor has is chosen when the
// program starts. All give the same bits: elementary operations only, no contraction, and sums
// in the order of a tree. (Not the public function itself: clang passes over the attribute
// where an earlier declaration lacks it.)
#if defined(__x86_64__) && defined(__has_attribute) && !defined(DEVIASCOPE_ONE_INSTRUCTION_SET)
#if __has_attribute(target_clones)
__attribute__((target_clones("default", "avx2", "arch=x86-64-v4")))
#endif
#endif
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
