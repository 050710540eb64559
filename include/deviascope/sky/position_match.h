// SPDX-License-Identifier: GPL-2.0-or-later
// SKY: where things are, no sources
#pragma once

#include <cstddef>
#include <cstdint>
#include <numbers>
#include <vector>

#include "deviascope/sky/direction.h"

namespace deviascope {

/// Radians in an arcsecond.
inline constexpr double radians_per_arcsec = std::numbers::pi / 648000.0;

/// Positions, ordered so that those near a direction are found quickly: zones of latitude, by
/// longitude inside each (the zones algorithm of Gray, Nieto-Santisteban & Szalay 2006,
/// Microsoft Research technical report MSR-TR-2006-52, from memory). Memory: 40 bytes a
/// position.
class PositionIndex {
  public:
    /// @param positions  unit vectors, one frame
    /// @param radius     radians, 0 < radius <= 0.1: what counts as the same place
    /// Errors: InternalError where the radius is outside.
    PositionIndex(const std::vector<Direction>& positions, double radius);

    std::size_t size() const { return entries_.size(); }
    double radius() const { return radius_; }

    /// True where a position lies within the radius: chord at most 2 sin(radius / 2).
    /// Threads: pure.
    bool has_neighbour(const Direction& direction) const;

    /// How many positions of `other` have a neighbour here: `has_neighbour` for each, in an
    /// order that keeps memory near.
    std::int64_t matches_of(const PositionIndex& other) const;

  private:
    struct Entry {
        std::int64_t zone;
        double lon;  ///< radians, -pi … pi
        Direction direction;
    };

    double latitude_of(const Direction& direction) const;
    std::int64_t zone_of(double latitude) const;
    bool near(std::int64_t zone, double from, double to, const Direction& direction) const;

    double radius_;
    double square_chord_;
    double zone_height_;
    std::vector<Entry> entries_;      ///< by zone, then longitude
    std::vector<std::size_t> first_;  ///< of each zone, and one beyond the last
};

}  // namespace deviascope
