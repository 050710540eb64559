// SPDX-License-Identifier: GPL-2.0-or-later
// WEIGHTS (private): bins as boxes in the properties of sources
#pragma once

#include <cstddef>
#include <string>
#include <vector>

#include "deviascope/counts/survey_input.h"
#include "weights/displacement.h"

namespace deviascope {

/// A property that some bin selects on.
struct Dimension {
    std::string property;
    Displaced kind = Displaced::not_at_all;
};

/// Range [low, high) of a box in one dimension.
struct BoxSide {
    std::size_t dimension = 0;
    double low = 0.0, high = 0.0;
    bool operator==(const BoxSide&) const = default;
};

/// A bin: sources whose values lie inside all sides.
struct BinBox {
    std::size_t bin = 0;  ///< index into SurveyInput::bins
    std::vector<BoxSide> sides;
};

/// A finite end of a side at which a boost makes sources cross.
struct Edge {
    std::size_t box = 0;
    std::size_t side = 0;
    bool upper = false;
    double value = 0.0;   ///< in the column's unit
    double centre = 0.0;  ///< its coordinate y
    Displaced kind = Displaced::flux;

    /// Whether sources at y above the edge are those inside the box.
    bool inside_is_above() const { return !upper; }
};

/// The boxes of the bins that are measured, their dimensions and edges.
struct Boxes {
    /// The survey's `select` and the bin's, range by range: their intersection.
    /// @param bins  that are measured, indices into survey.bins
    /// Errors: InputError: no source can lie in both ranges of a property; an edge at a
    /// negative flux or size, or at a redshift of -1 or below.
    Boxes(const SurveyInput& survey, const std::vector<std::size_t>& bins);

    bool need_spectral_index() const;

    /// The first edge at which the same sources cross: equal in property and value, of boxes
    /// whose other sides are equal (neighbouring bins share such an edge).
    std::size_t first_like(std::size_t e) const;

    std::vector<Dimension> dimension;
    std::vector<BinBox> box;
    std::vector<Edge> edge;                               ///< of all boxes, in their order
    std::vector<std::vector<std::size_t>> edges_of_side;  ///< [side, counted over all boxes]
    std::vector<std::size_t> first_side;                  ///< of each box in that count
};

}  // namespace deviascope
