// SPDX-License-Identifier: GPL-2.0-or-later
// counts -> MODEL -> ensemble
#pragma once

#include <Eigen/Core>
#include <vector>

#include "deviascope/counts/count_map.h"
#include "deviascope/model/parameter_space.h"
#include "deviascope/sky/direction.h"

namespace deviascope {

/// The expected number of sources in each kept pixel of a bin,
///   lambda_p = Omega M w_p [gamma (1 - beta.n_p)]^-B (1 + r D.n_p)     (README, "The model")
/// @param term        one of space.terms()
/// @param parameters  a full row, inside the walls; a monopole that is NaN is taken as its
///                    maximum, so that the sum of lambda is the bin's number of sources
/// @return  in the order of the bin's footprint. Threads: pure.
std::vector<double> expected_counts(const Counts& counts,
                                    const BinTerm& term,
                                    const Eigen::Ref<const Eigen::VectorXd>& parameters);

/// The same per steradian at full exposure in a direction, lambda / (Omega w).
/// @param parameters  a full row with its monopole
double expected_density(const BinTerm& term,
                        const Eigen::Ref<const Eigen::VectorXd>& parameters,
                        const Direction& direction);

}  // namespace deviascope
