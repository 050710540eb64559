// SPDX-License-Identifier: GPL-2.0-or-later
// WEIGHTS (private): how far from an edge sources are looked at
#pragma once

#include <optional>
#include <span>
#include <vector>

#include "deviascope/weights/measured_weights.h"
#include "weights/density_fit.h"
#include "weights/edge_cells.h"

namespace deviascope {

/// Cells that are used, counted from the edge.
struct EdgeWindow {
    int below = 0;
    int above = 0;
    int n_cells() const { return below + above; }
    bool operator==(const EdgeWindow&) const = default;
};

/// Degree of ln f in the windows that are used; its test is made with `test_degree`.
inline constexpr int density_degree = 2;
inline constexpr int test_degree = 4;

/// The sources near an edge, as far as the choice of a window needs them.
struct EdgeNeighbourhood {
    const EdgeCells& cells;
    std::span<const double> count;  ///< EdgeCells::number
    double extent_below = 0.0;      ///< of the catalogue, in y, at most to the last source
    double extent_above = 0.0;
    bool inside_is_above = true;
    bool is_end_of_property = false;  ///< the property itself may end here
};

/// The windows that were chosen for an edge.
struct EdgePlan {
    EdgeMethod method = EdgeMethod::central;
    EdgeWindow window;
    EdgeWindow half, twice;  ///< for the test of stability
    double sources = 0.0;    ///< in the window
    bool too_few = false;    ///< of sources: nothing can be said
    bool unsettled = false;  ///< even in the narrowest windows ln f is no polynomial
    bool falls_off = false;  ///< far fewer sources outside than the inside lets expect
    bool operator==(const EdgePlan&) const = default;
};

/// Chooses the window that balances bias and noise. Windows shrink from the whole neighbourhood
/// by factors of sqrt(2). In each, ln f at the edge is fitted with degrees 2 and 4; their
/// difference is what the lower degree misses. The widest window in which, and in the next
/// narrower of which, that difference stays within two of its standard deviations shows no
/// bias; the window used is half as wide, where a smooth density's bias is smaller by a factor
/// of 16 (both sides) or 8 (one side): below a tenth, or a quarter, of the noise. Outside the
/// catalogue's extent there is no window. Where sources fall off at the edge itself (less than
/// 0.7 of what the inside lets expect, at five standard deviations), the catalogue is taken to
/// end there.
EdgePlan plan_edge(const EdgeNeighbourhood& edge);

/// The counts of a window's cells.
std::span<const double> within(std::span<const double> cells, const EdgeWindow& window);
/// The boundaries of a window's cells.
std::vector<double> boundaries_of(const EdgeCells& cells, const EdgeWindow& window);

}  // namespace deviascope
