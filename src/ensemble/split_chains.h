// SPDX-License-Identifier: GPL-2.0-or-later
// ENSEMBLE, inside: variances and autocovariances of split chains
#pragma once

#include <Eigen/Core>
#include <span>

#include "deviascope/core/large_array.h"

namespace deviascope {

/// Several chains of equal length stored draw by draw: value[draw * n_chains + chain].
/// All functions here want an even number of draws; `without_middle` makes it so.
struct Chains {
    std::span<const double> value;
    Eigen::Index n_chains = 0;

    Eigen::Index n_draws() const { return static_cast<Eigen::Index>(value.size()) / n_chains; }
};

/// A copy without the middle draw of each chain where the number of draws is odd.
LargeArray without_middle(const Chains& chains);

/// sqrt(var+ / W) of the halves of all chains; NaN where all is constant.
double split_rhat(const Chains& chains);

/// Effective number of draws of the halves of all chains; NaN where all is constant.
double split_effective_size(const Chains& chains);

}  // namespace deviascope
