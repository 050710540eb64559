// SPDX-License-Identifier: GPL-2.0-or-later
// JOB: TOML to the options of the stages
#pragma once

#include <optional>
#include <string>

#include "deviascope/model/model_options.h"
#include "deviascope/model/vector_prior.h"
#include "job/toml_reader.h"

namespace deviascope {

/// The prior that a table (inline, or a whole prior file) describes, in the job's frame; the
/// keys of each kind are those of the README.
/// @param name  of the prior file; empty: the kind's
std::optional<VectorPrior> read_vector_prior(const TomlTable& table,
                                             const std::string& name,
                                             Frame job_frame);

/// The `[monopole]` table: `prior` (log-uniform where absent) and `sample`.
MonopolePrior read_monopole(const TomlTable& table);

}  // namespace deviascope
