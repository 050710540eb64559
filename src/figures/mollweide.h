// SPDX-License-Identifier: GPL-2.0-or-later
// FIGURES, inside: the whole sky as an ellipse of equal areas
#pragma once

#include <optional>

#include "deviascope/sky/direction.h"

namespace deviascope {

/// Mollweide's projection about a central longitude, longitudes growing to the left as the sky
/// is seen from inside: x = -(2/pi) (lon - lon0) cos t, y = sin t, 2t + sin 2t = pi sin(lat),
/// on the ellipse (x/2)^2 + y^2 <= 1.
/// Source: Snyder 1987, Map Projections: A Working Manual, USGS Professional Paper 1395,
/// p. 251, Eqs 31-1 to 31-3, scaled (from memory).
class Mollweide {
  public:
    explicit Mollweide(double centre_lon_deg = 0.0) : centre_deg_(centre_lon_deg) {}

    struct Place {
        double x = 0.0, y = 0.0;  ///< -2 … 2 to the right, -1 … 1 up
    };
    Place project(const Direction& direction) const;
    /// Empty outside the ellipse.
    std::optional<Direction> direction_at(const Place& place) const;
    /// The place itself, or where it is outside the one drawn in to the rim towards the centre.
    static Place inside(const Place& place);
    double centre_lon_deg() const { return centre_deg_; }

  private:
    double centre_deg_;
};

}  // namespace deviascope
