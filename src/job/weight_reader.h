// SPDX-License-Identifier: GPL-2.0-or-later
// JOB: TOML to the options of the stages
#pragma once

#include <optional>
#include <string>
#include <vector>

#include "deviascope/model/model_options.h"
#include "job/surroundings.h"
#include "job/toml_reader.h"

namespace deviascope {

/// What was read of a survey's kinematic weights.
struct WeightReading {
    std::optional<WeightPrior> prior;  ///< empty where a fault was noted
    std::vector<std::string> warnings;
    bool measure = false;     ///< the survey says weights = "measure"
    bool unmeasured = false;  ///< and its weights are not known yet: NaN in the prior
};

/// Kinematic weights of a survey's bins: each bin's `weight`, else the survey's `weights` file.
///
///   { mean, sd }, or { x, x_sd, alpha, alpha_sd }:
///   mean 2 + x (1 + alpha),  sd^2 = ((1 + alpha) x_sd)^2 + (x alpha_sd)^2
///
/// A weights file holds `survey`, `[[bin]]` with `name`, `mean` and `sd`, and optionally
/// `covariance` (of its bins, in its order; then `sd` may be left out), besides what measured
/// weights report. A bin's own `weight` stands in for its row of the file, without covariance.
/// With weights = "measure" the file is the measured one, from the surroundings.
/// @param names  of the bins, in the order of `bins`
/// Source: Ellis & Baldwin 1984 for the mean; linear propagation of independent errors.
WeightReading read_weights(const TomlTable& survey,
                           const std::string& survey_name,
                           const std::vector<TomlTable>& bins,
                           const std::vector<std::string>& names,
                           Surroundings& surroundings);

}  // namespace deviascope
