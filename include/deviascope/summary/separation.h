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
/// Definitions: design section 6, "Separation".
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

/// @param mean        posterior means of all parameters (a row)
/// @param covariance  posterior covariance of the velocity's free coordinates (n_free x n_free)
Separation separation_of(const Counts& counts,
                         const ParameterSpace& space,
                         const Eigen::VectorXd& mean,
                         const Eigen::MatrixXd& covariance);

}  // namespace deviascope
