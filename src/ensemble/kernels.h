// SPDX-License-Identifier: GPL-2.0-or-later
// ENSEMBLE, inside: how one walker proposes a move
#pragma once

#include <array>
#include <cstddef>

#include "deviascope/core/random.h"
#include "deviascope/ensemble/options.h"
#include "ensemble/independence.h"

namespace deviascope {

/// The frozen other half: `count` walkers of n coordinates each, one after the other.
struct Partners {
    const double* first = nullptr;
    std::size_t count = 0;
    std::size_t n_coordinates = 0;

    const double* at(std::size_t walker) const { return first + walker * n_coordinates; }
};

/// What was proposed; the new coordinates go to where the caller wants them.
struct Proposal {
    Kernel kernel = Kernel::stretch;
    double log_factor = 0.0;  ///< ln of what multiplies the ratio of densities
};

/// Draws kernels with their fractions.
class KernelMix {
  public:
    /// Without an independence proposal its share goes to the other kernels, in proportion.
    /// Errors: UsageError where there are no others.
    KernelMix(const KernelFractions& fractions, bool has_independence);
    /// The kernel of a uniform number in [0, 1); never one whose fraction is 0.
    Kernel at(double u) const;

  private:
    std::array<double, n_kernels> up_to_{};  ///< running sum of fractions
    Kernel last_ = Kernel::stretch;          ///< last with a fraction above 0
};

/// Stretch factor of a uniform number: g(z) ~ z^(-1/2) on [1/a, a] with a = 2.
///   z(u) = ((a - 1) u + 1)^2 / a
/// Source: Goodman & Weare 2010, CAMCoS 5, 65, eqs 9-10.
double stretch_factor(double u);

/// Proposes a move of the walker at `position`; draws in the order kernel, partners, numbers of
/// the kernel. The acceptance number is left to the caller and comes last.
///
///   stretch                 y = x_j + z (x - x_j),            log factor (n-1) ln z
///   differential-evolution  y = x + g (x_j - x_k), j != k,    log factor 0
///     g = base (1 + 0.01 s), s standard normal, base = 2.38 / sqrt(2n), in one of ten moves 1;
///     multiplicative because coordinates span many decades
///   independence            y ~ q,                            log factor ln q(x) - ln q(y)
/// Sources: Goodman & Weare 2010; ter Braak 2006, Stat. Comput. 16, 239; Tierney 1994, Ann.
/// Stat. 22, 1701.
/// @param independence  q; null where `mix` never draws that kernel
Proposal propose(const KernelMix& mix,
                 const double* position,
                 const Partners& partners,
                 const IndependenceProposal* independence,
                 Stream& stream,
                 double* proposal);

}  // namespace deviascope
