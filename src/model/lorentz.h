// SPDX-License-Identifier: GPL-2.0-or-later
// MODEL, private
#pragma once

#include <Eigen/Core>
#include <cmath>

namespace deviascope {

/// ln gamma = -ln(1 - beta^2) / 2 of a velocity in units of c, |beta| < 1.
inline double log_lorentz_factor(const Eigen::Vector3d& velocity) {
    return -0.5 * std::log1p(-velocity.squaredNorm());
}

}  // namespace deviascope
