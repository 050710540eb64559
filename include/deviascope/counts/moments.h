// SPDX-License-Identifier: GPL-2.0-or-later
// catalogue -> COUNTS -> model
#pragma once

#include "deviascope/counts/count_map.h"

namespace deviascope {

/// Degree up to which counts have moments, and exposures one more.
inline constexpr int moment_degree = 8;

/// Fills `Footprint::moment` and `BinCounts::excess_moment` where they are missing, in one pass
/// over the pixels of each footprint:
///
///   W_m  = sum_p w_p n_p^m / sum_p w_p,            n^m = nx^i ny^j nz^l, i + j + l <= 9
///   dP_m = sum_p (n_p - N w_p / sum_p w_p) n_p^m,   i + j + l <= 8
///
/// n_p^m are monomials of the components of the pixel's centre, degree by degree (order:
/// src/counts/monomials.h). Excess moments are what the counts have beyond an isotropic sky, so
/// that 10^9 sources cost no digits. Blocks of 64 pixels are summed in double, blocks in long
/// double; the same bits with every instruction set.
/// Accuracy: W_m to 1e-15; dP_m to 1e-13 sqrt(N) + 1e-15 N / sqrt(pixels).
/// Source: design section 3 (expansion of the log-likelihood in powers of beta.n and D.n).
void add_moments(Counts& counts);

/// True where every footprint and every bin has its moments.
bool has_moments(const Counts& counts);

}  // namespace deviascope
