// SPDX-License-Identifier: GPL-2.0-or-later
// ENSEMBLE, inside: what a log density may be
#pragma once

#include <Eigen/Core>
#include <cstdint>
#include <string_view>

#include "deviascope/core/target.h"

namespace deviascope {

/// Whose density it is. `count` is the step or the attempt, `counted` says which.
struct WalkerPlace {
    Eigen::Index replicate = 0;
    Eigen::Index walker = 0;
    std::string_view counted;
    std::int64_t count = 0;
};

/// A log density is a finite number or -inf; the likelihood is not asked for where the
/// posterior is -inf. Errors: NumericalError with place, coordinates and sampled parameters.
void require_density(const Target& target,
                     const WalkerPlace& place,
                     const Eigen::Ref<const Eigen::VectorXd>& coordinates,
                     double log_posterior,
                     double log_likelihood);

}  // namespace deviascope
