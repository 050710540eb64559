// SPDX-License-Identifier: GPL-2.0-or-later
// chain -> SUMMARY -> figures
#pragma once

#include <Eigen/Core>
#include <memory>
#include <span>
#include <vector>

#include "deviascope/sky/direction.h"

namespace deviascope {

/// The posterior density of a direction on the sphere, estimated from draws; one estimate
/// serves summary and figures (figures.md of the design, "On the sphere").
///
/// Compact posteriors (the draws' 95.45 % radius about the mean direction below 40 deg and mean
/// length >= 0.2): Gaussian kernel in whitened Lambert equal-area tangent coordinates about the
/// mean direction, no floor. Wider ones: von Mises-Fisher kernel on draws binned to HEALPix
/// nside 64. Levels: quantiles of the density at the draws themselves.
class DirectionDensity {
  public:
    /// @param draws            unit vectors, one frame
    /// @param effective_draws  for the bandwidth rule (at most draws.size())
    DirectionDensity(std::span<const Direction> draws, double effective_draws);
    ~DirectionDensity();
    DirectionDensity(DirectionDensity&&) noexcept;

    /// Density per steradian at a direction.
    double at(const Direction& direction) const;
    /// Density such that the region above it holds `probability` of the draws.
    double level(double probability) const;
    /// Area of that region, square degrees.
    double area_deg2(double probability) const;

  private:
    struct Parts;
    std::unique_ptr<Parts> parts_;
};

/// Mean direction of unit vectors, and the length of their mean (0 … 1).
struct MeanDirection {
    Direction direction;  ///< NaN components where length < 0.2: no direction to speak of
    double length;
};
inline constexpr double least_mean_length = 0.2;
MeanDirection mean_direction(std::span<const Direction> draws);

}  // namespace deviascope
