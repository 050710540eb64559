// SPDX-License-Identifier: GPL-2.0-or-later
// MODEL, private: where walkers begin
#pragma once

#include <Eigen/Core>

#include "deviascope/core/random.h"
#include "deviascope/counts/count_map.h"
#include "deviascope/model/parameter_space.h"

namespace deviascope {

/// A Gaussian about one Newton step from zero dipoles and prior-mean weights (fixed vectors at
/// their values), with four times the covariance that counts and priors lead one to expect
/// there. Integrated monopoles are eliminated; priors enter as in prior_information.h.
class StartGaussian {
  public:
    StartGaussian(const Counts& counts, const ParameterSpace& space);

    /// One draw, as coordinates. Where it lies outside a prior's ball (or, for `axis`, range)
    /// or a wall, it is drawn back towards the mean of the Gaussian along a straight line, to
    /// cbrt(u) of the longest step that stays inside: combinations that the counts measure well
    /// are kept. Stream: one normal a coordinate, then u.
    void draw(Stream& stream, Eigen::Ref<Eigen::VectorXd> coordinates) const;

  private:
    double longest_step(const Eigen::VectorXd& from, const Eigen::VectorXd& step) const;

    const ParameterSpace& space_;
    Eigen::VectorXd origin_;      ///< row of parameters at the zero of the free parameters
    Eigen::MatrixXd directions_;  ///< free_directions
    Eigen::VectorXd mean_;        ///< free parameters
    Eigen::MatrixXd factor_;      ///< of the covariance, times 2
};

}  // namespace deviascope
