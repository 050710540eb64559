// SPDX-License-Identifier: GPL-2.0-or-later
// MODEL, private: the priors in fits
#pragma once

#include <Eigen/Core>

#include "model/free_parameters.h"

namespace deviascope {

/// The log prior of the free parameters to second order, and how wide the priors without
/// curvature are.
struct PriorExpansion {
    double value = 0.0;           ///< up to a constant; flat priors are 0
    Eigen::VectorXd gradient;     ///< n_free
    Eigen::MatrixXd information;  ///< n_free x n_free: minus the second derivatives
};

/// At given free parameters; Gaussian priors and those of sampled monopoles exactly, vectors
/// under bounded priors flat, whatever their length.
PriorExpansion prior_expansion(const FreeParameters& parameters,
                               const Eigen::Ref<const Eigen::VectorXd>& free);

/// Inverse covariance of the bounded priors (VectorPrior::covariance), 0 for all others:
/// what keeps a Gaussian no wider than the prior where the counts say nothing.
Eigen::MatrixXd bounded_information(const FreeParameters& parameters);

}  // namespace deviascope
