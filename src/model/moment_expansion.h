// SPDX-License-Identifier: GPL-2.0-or-later
// MODEL, private: the moment engine's series with their derivatives
#pragma once

#include "model/bin_expansion.h"
#include "model/moment_group.h"

namespace deviascope {

/// As pixel_expansion, from the moments of a group's bin, series to the highest degree:
///   C = B S(beta) - S(-r D) + (N B / 2) ln(1 - beta^2),  S(u) = sum_k P_k(u) / k,
///   E/E0 = gamma^-B sum_k c_k(B) [W_k(beta) + r D.g_k(beta)],  c_k = C(B+k-1, k)
BinExpansion moment_expansion(const MomentGroup& group,
                              std::size_t bin,
                              const Eigen::Ref<const Eigen::VectorXd>& row);

}  // namespace deviascope
