// SPDX-License-Identifier: GPL-2.0-or-later
// JOB: TOML to the options of the stages
#pragma once

#include <optional>

#include "deviascope/ensemble/options.h"
#include "deviascope/model/model_options.h"
#include "job/toml_reader.h"

namespace deviascope {

/// Coordinates that the sampler will move for these options (the rule of ParameterSpace).
Eigen::Index n_coordinates_of(const ModelOptions& model);

/// `engine` and `tolerance` of the `[ensemble]` table.
EngineOptions read_engine(const TomlTable& table);

/// The rest of the `[ensemble]` table.
/// @param n_coordinates  for the least number of walkers; empty where faults leave it unknown
EnsembleOptions read_ensemble(const TomlTable& table,
                              const std::optional<Eigen::Index>& n_coordinates);

}  // namespace deviascope
