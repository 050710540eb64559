// SPDX-License-Identifier: GPL-2.0-or-later
// model -> ENSEMBLE -> chain
#pragma once

#include <Eigen/Core>
#include <string>
#include <vector>

#include "deviascope/core/parameter.h"

namespace deviascope {

/// A scalar whose convergence is watched: each sampled parameter, each free amplitude, each
/// component of each free unit direction; constants and redrawn parameters are left out.
struct MonitoredScalar {
    enum class Kind { parameter, amplitude, direction };
    std::string name;  ///< `velocity.x`, `velocity.amplitude`, `velocity.direction.x`
    Kind kind = Kind::parameter;
    Eigen::Index first = 0;  ///< parameter, or x component of the vector
    int component = 0;       ///< of the direction: 0, 1, 2

    /// Its value in one row of parameters, in the unit of the parameter (direction: 1).
    /// A vector of length zero has no direction: each component is then 0.
    double value(const double* parameters) const;
};

/// In the order: sampled parameters, then for each vector its amplitude and its direction.
std::vector<MonitoredScalar> monitored_scalars(const std::vector<Parameter>& parameters,
                                               const std::vector<VectorParameter>& vectors);

}  // namespace deviascope
