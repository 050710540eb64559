// SPDX-License-Identifier: GPL-2.0-or-later
// JOB: TOML to the options of the stages
#pragma once

#include <Eigen/Core>
#include <string>
#include <vector>

#include "deviascope/chain/chain.h"
#include "deviascope/model/model_options.h"

namespace deviascope {

/// A weights file, read: the weights of its bins, in its order.
struct WeightsFile {
    std::vector<std::string> bins;
    WeightPrior weights;
};

/// Errors: UsageError with all faults (keys: see `read_weights`).
WeightsFile parse_weights(const Companion& companion, const std::string& survey);

}  // namespace deviascope
