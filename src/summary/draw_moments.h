// SPDX-License-Identifier: GPL-2.0-or-later
// chain -> SUMMARY -> figures
#pragma once

#include <Eigen/Core>
#include <optional>

#include "deviascope/core/target.h"

namespace deviascope {

/// Mean and covariance (with n - 1; NaN for one draw) of the columns.
struct DrawMoments {
    Eigen::VectorXd mean;
    Eigen::MatrixXd covariance;
};
DrawMoments moments_of(const Eigen::MatrixXd& draws);

/// The Gaussian of these moments; nothing where the covariance is not positive definite, as
/// with fewer draws than coordinates.
std::optional<CoordinateGaussian> gaussian_of(const Eigen::MatrixXd& draws);

}  // namespace deviascope
