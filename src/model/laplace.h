// SPDX-License-Identifier: GPL-2.0-or-later
// MODEL, private: the posterior as a Gaussian
#pragma once

#include <string>
#include <vector>

#include "deviascope/core/target.h"
#include "model/engines.h"
#include "model/free_parameters.h"

namespace deviascope {

/// The Laplace approximation (Laplace 1774; MacKay 2003, chapter 27): mode by Newton's method
/// with line search, from exact first and second derivatives; precision = curvature there.
///
/// Bounded priors are flat in the vector during the search. A mode held by a bound becomes the
/// mean and variance of the truncated normal across it (derived in DEVELOPERS.md). Where the
/// curvature, measured in units of the prior's information, is below 1, it is 1: the prior's
/// own Gaussian in directions about which the counts say nothing; where it is not even
/// positive, a warning names the parameters.
class Laplace {
  public:
    /// @param seed  of the keyed draws that turn the Gaussian into the sampler's coordinates
    Laplace(const Counts& counts,
            const ParameterSpace& space,
            const Engines& engines,
            std::uint64_t seed);

    /// In the sampler's coordinates. Equal to the Gaussian of the free parameters, but mean and
    /// covariance of 4,096 keyed draws inside all bounds where a vector is under
    /// `uniform-amplitude` or more than 1 % of the draws lie outside.
    const CoordinateGaussian& in_coordinates() const { return in_coordinates_; }

    /// One draw from the Gaussian with four times the covariance, as coordinates. Where it lies
    /// outside a bound, it is drawn back towards the mean along a straight line, to cbrt(u) of
    /// the longest step that stays inside: combinations that the counts measure well are kept.
    /// Stream: one normal a coordinate, then u.
    void draw_start(Stream& stream, Eigen::Ref<Eigen::VectorXd> coordinates) const;

    const std::vector<std::string>& warnings() const { return warnings_; }

  private:
    class Fit;
    Eigen::VectorXd draw_inside(double scale, Stream& stream) const;
    void turn_into_coordinates(std::uint64_t seed);

    FreeParameters parameters_;
    Eigen::VectorXd mean_;    ///< free parameters, inside
    Eigen::MatrixXd factor_;  ///< lower, of the covariance
    CoordinateGaussian in_coordinates_;
    std::vector<std::string> warnings_;
};

}  // namespace deviascope
