// SPDX-License-Identifier: GPL-2.0-or-later
// FIGURES, inside: what the figures on the sky share
#pragma once

#include <vector>

#include "figures/sheet.h"
#include "figures/sky_panel.h"

namespace deviascope {

/// The two regions of a vector on a map, where its direction is free.
struct VectorRegions {
    VectorSeries series;
    MapLines region68, region95;
    bool is_on_map() const { return !region95.empty(); }
};
VectorRegions regions_of(const FigureContext& context,
                         const Mollweide& map,
                         const VectorSeries& series);

/// Mean direction in the job's frame; empty where there is none, or the vector is zero.
std::optional<Direction> pointing_of(const FigureContext& context, const VectorSeries& series);

/// Whether a bin of the survey has a dispersion other than 1: its noise is not Poisson's.
bool is_dispersed(const FigureContext& context, std::size_t survey);

/// 0, or 180 where that keeps the 95 % regions farther from the seam.
double quiet_centre(const FigureContext& context, const std::vector<VectorSeries>& series);

/// Names of a direction's coordinates in a frame, and the place: `(l, b) = (206.8°, 35.2°)`.
std::string place_in_words(const LonLat& place, Frame frame);

/// One row a point of the edge: vector, percent, piece, longitude and latitude (degrees).
void add_edges(CsvText& csv, const Mollweide& map, const VectorRegions& regions);

}  // namespace deviascope
