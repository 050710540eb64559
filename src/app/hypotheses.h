// SPDX-License-Identifier: GPL-2.0-or-later
// APP: on top of all stages
#pragma once

#include <optional>
#include <string>
#include <vector>

#include "deviascope/job/job.h"

namespace deviascope {

/// A hypothesis as a model: the job's with other priors.
struct NamedModel {
    std::string name;
    ModelOptions model;
};

/// The four that every comparison makes (README, "The comparison"), then the job's own.
std::vector<NamedModel> hypotheses_of(const Job& job, const VectorPrior& reference);

/// A model with other priors: those of the intrinsic dipoles of all surveys at once.
ModelOptions with_velocity(ModelOptions model, const VectorPrior& velocity);
ModelOptions with_intrinsic(ModelOptions model, const VectorPrior& intrinsic, bool shared);

/// The model with the prior of the velocity (or of every intrinsic dipole) `factor` times as
/// wide; empty where no such prior has a width to choose: fixed ones, Gaussians about another
/// vector than 0 (measurements), a ball that is as wide as can be.
std::optional<ModelOptions> with_velocity_width(const ModelOptions& model, double factor);
std::optional<ModelOptions> with_intrinsic_width(const ModelOptions& model, double factor);

}  // namespace deviascope
