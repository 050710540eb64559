// SPDX-License-Identifier: GPL-2.0-or-later
// JOB: TOML to the options of the stages
#pragma once

#include <Eigen/Core>
#include <optional>
#include <string>

#include "job/toml_reader.h"

namespace deviascope {

/// A covariance matrix of n quantities: symmetric (to 1e-9 of its largest element; the mean of
/// both halves is taken) and positive definite (smallest eigenvalue above 1e-12 of the largest,
/// after scaling to unit diagonal).
/// @param constants  a quantity of variance 0 is allowed where its row and column are 0
std::optional<Eigen::MatrixXd> read_covariance(const TomlTable& table,
                                               const std::string& key,
                                               Eigen::Index n,
                                               Presence presence,
                                               bool constants = false);

}  // namespace deviascope
