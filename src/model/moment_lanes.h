// SPDX-License-Identifier: GPL-2.0-or-later
// MODEL, private: the moment engine's series for a few walkers side by side
#pragma once

#include <algorithm>
#include <array>
#include <vector>

#include "core/lanes.h"
#include "deviascope/counts/moments.h"
#include "model/moment_group.h"

namespace deviascope {

/// One number of each walker (a struct, so that containers keep its alignment).
struct LaneNumber {
    Lanes value{};
    void set(std::size_t lane, double number) { value[lane] = number; }
    double at(std::size_t lane) const { return value[lane]; }
};
using LaneVector = std::array<LaneNumber, 3>;

/// A vector of each walker, and the degree to which its series goes.
struct LaneSeries {
    LaneVector vector;
    int highest = 0;  ///< the largest degree among the walkers
    /// 1 in the lanes whose series goes to this degree or further, else 0.
    std::array<LaneNumber, moment_degree + 1> keep{};

    void set_degree(std::size_t lane, int degree) {
        highest = std::max(highest, degree);
        for (int k = 0; k <= moment_degree; ++k)
            keep[static_cast<std::size_t>(k)].set(lane, k <= degree ? 1.0 : 0.0);
    }
};

/// A block of walkers, made ready.
struct LaneWalkers {
    LaneSeries velocity;
    std::vector<LaneSeries> receding;  ///< -r D, one a group
    std::vector<LaneNumber> weight;    ///< one a term
};

/// What comes out, one a term.
struct LaneSums {
    std::vector<LaneNumber> balance;     ///< X + N (H - (log1p(x) - x))
    std::vector<LaneNumber> log_excess;  ///< log1p(x)
};

/// Sums of all groups for a block of walkers.
void sum_lanes(const std::vector<MomentGroup>& groups,
               const LaneWalkers& walkers,
               LaneSums& sums);

}  // namespace deviascope
