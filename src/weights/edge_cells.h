// SPDX-License-Identifier: GPL-2.0-or-later
// WEIGHTS (private): the cells in which sources near an edge are counted
#pragma once

#include <algorithm>
#include <cmath>
#include <cstddef>
#include <vector>

namespace deviascope {

/// Cells on both sides of an edge, narrow near it and wider farther out:
///
///   boundary k = reach sinh(3 k / n) / sinh(3),  k = -n … n;  the edge itself is boundary 0.
///
/// Cells are numbered from 0 (farthest below the edge) to 2n - 1. With n = 96 the first is
/// 0.003 reach wide and the last 0.03.
class EdgeCells {
  public:
    static constexpr int a_side = 96;  ///< n
    static constexpr std::size_t number = 2 * static_cast<std::size_t>(a_side);

    explicit EdgeCells(double reach) : reach_(reach) {}

    double reach() const { return reach_; }
    double boundary(int k) const {
        return reach_ * (std::sinh(steepness * k / a_side) / std::sinh(steepness));
    }
    /// Cells a side that lie within a distance of the edge, as a whole.
    int whole_cells_within(double distance) const {
        if (distance >= reach_) return a_side;
        return static_cast<int>(position_of(std::max(distance, 0.0)));
    }
    /// The cell of a value at a distance |y - edge| < reach.
    std::size_t cell(double distance, bool above) const {
        const int step = std::min(static_cast<int>(position_of(distance)), a_side - 1);
        return static_cast<std::size_t>(above ? a_side + step : a_side - 1 - step);
    }
    /// Boundaries first … last.
    std::vector<double> boundaries(int first, int last) const {
        std::vector<double> out;
        for (int k = first; k <= last; ++k) out.push_back(boundary(k));
        return out;
    }

  private:
    static constexpr double steepness = 3.0;
    /// Cells between the edge and a distance, as a real number.
    double position_of(double distance) const {
        return std::asinh(distance / reach_ * std::sinh(steepness)) * (a_side / steepness);
    }

    double reach_;
};

}  // namespace deviascope
