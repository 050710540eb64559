// SPDX-License-Identifier: GPL-2.0-or-later
// counts -> MODEL -> ensemble
#pragma once

#include <Eigen/Core>
#include <string>
#include <vector>

#include "deviascope/counts/count_map.h"
#include "deviascope/model/parameter_space.h"

namespace deviascope {

/// What a fit of these counts is expected to say of one vector, before any is made. Standard
/// deviations are of one component: the root mean square over the free ones (three, or one
/// along an axis).
struct VectorForecast {
    std::string name;          ///< of the VectorParameter
    Eigen::Index n_free = 0;   ///< 0: fixed; the rest is then zero
    double counts_sd = 0.0;    ///< without this vector's prior; infinite where it rules alone
    double expected_sd = 0.0;  ///< with all priors
    double prior_sd = 0.0;     ///< of the prior alone
    /// What is expected is above 0.8 of the prior's own sd, and the prior is no measurement (a
    /// Gaussian about another vector than 0): the prior is narrower than the noise of the
    /// counts, and will be most of the result.
    bool prior_rules = false;
};

/// From the expected (Fisher) information at zero dipoles, fixed vectors at their values,
/// weights at their prior means and monopoles at their maxima. All else is eliminated by Schur
/// complement: other vectors and weights under their priors (bounded ones as the Gaussian of
/// the same covariance), monopoles flat.
/// @return  one for each of space.vectors()
std::vector<VectorForecast> forecast(const Counts& counts, const ParameterSpace& space);

}  // namespace deviascope
