// SPDX-License-Identifier: GPL-2.0-or-later
// MODEL, private: the priors as a Gaussian, for fits and starting points
#pragma once

#include <Eigen/Core>

#include "deviascope/model/parameter_space.h"

namespace deviascope {

// Fits move *free parameters*: one a coordinate and in their order, but vectors under
// `uniform-amplitude` stay vectors (a Gaussian in u would be a poor picture of one in v), and a
// sampled monopole is ln M.

/// d (row of parameters, monopoles as ln M) / d (free parameters): n_parameters x
/// n_coordinates.
Eigen::MatrixXd free_directions(const ParameterSpace& space);

/// Gradient of the log prior at the origin, and minus its curvature, in the free parameters.
struct PriorInformation {
    Eigen::VectorXd gradient;     ///< n_coordinates
    Eigen::MatrixXd information;  ///< n_coordinates x n_coordinates
};

/// The origin is: free vectors 0, weights at their prior means, monopoles as in `row`. Gaussian
/// priors as they are; bounded ones as the Gaussian with their mean and covariance, so that
/// what the counts do not determine stays about as wide as the prior allows.
PriorInformation prior_information(const ParameterSpace& space,
                                   const Eigen::Ref<const Eigen::VectorXd>& row);

}  // namespace deviascope
