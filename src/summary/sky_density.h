// SPDX-License-Identifier: GPL-2.0-or-later
// chain -> SUMMARY -> figures
#pragma once

#include <span>
#include <vector>

#include "deviascope/sky/direction.h"

namespace deviascope {

/// A smooth density on the sphere, made from draws; one derived class a kind of posterior.
class SkyDensity {
  public:
    virtual ~SkyDensity() = default;
    /// Density per steradian.
    virtual double at(const Direction& direction) const = 0;
    /// Density at each draw, per steradian.
    virtual std::vector<double> at_each(std::span<const Direction> draws) const = 0;
    /// Steradians where the density exceeds a level > 0.
    virtual double area_above(double level) const = 0;
};

}  // namespace deviascope
