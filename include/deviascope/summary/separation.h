// SPDX-License-Identifier: GPL-2.0-or-later
// chain -> SUMMARY -> figures
#pragma once

#include <Eigen/Core>
#include <optional>
#include <string>
#include <vector>

#include "deviascope/counts/count_map.h"
#include "deviascope/model/parameter_space.h"

namespace deviascope {

/// How far the bins, rather than the priors, separate velocity and intrinsic dipole.
/// Definitions: README, "The summary, number by number".
struct SeparationEntry {
    std::optional<double> weight_spread;  ///< per survey only
    std::optional<double>
        velocity_prior_share;  ///< 0 … 1; empty where the velocity is not free
    std::string verdict;
};
struct Separation {
    std::vector<SeparationEntry> surveys;  ///< job order
    SeparationEntry joint;
};

/// Columns that turn the velocity's free coordinates, as the separation counts them, into the
/// vector: 3 x 3 identity, the axis (3 x 1) under an `axis` prior, 3 x 0 where it is fixed.
Eigen::MatrixXd free_velocity_coordinates(const ParameterSpace& space);

///   I = sum over terms of the expected information (model/information.h), plus the prior
///       information of the weights, all but the velocity eliminated by Schur complement
///   velocity_prior_share = 1 - tr(I Sigma) / n_free, clipped to 0 … 1
///
/// Joint: all surveys, Sigma the posterior covariance. A survey's entry: that survey alone,
/// Sigma^-1 = information with the intrinsic prior added before the elimination + velocity
/// prior. A verdict of a fixed velocity says so.
/// Errors: InternalError where the covariance has another size than the free coordinates.
///
/// @param mean        posterior means of all parameters (a row)
/// @param covariance  posterior covariance of the velocity's free coordinates (n_free x n_free)
Separation separation_of(const Counts& counts,
                         const ParameterSpace& space,
                         const Eigen::VectorXd& mean,
                         const Eigen::MatrixXd& covariance);

}  // namespace deviascope
