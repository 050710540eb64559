// SPDX-License-Identifier: GPL-2.0-or-later
// FIGURES, inside: level lines of a field on a grid
#pragma once

#include <Eigen/Core>
#include <vector>

#include "figures/drawing.h"

namespace deviascope {

/// Closed lines around where a field exceeds a level, in units of cells: node (column, row) of
/// `field` stands at (column, row). Marching squares with linear interpolation on a grid that
/// is padded by one node below the level, so that every line is closed; saddles are told by
/// the mean of the four. Areas are filled by the even-odd rule, holes are lines too.
/// Source: Lorensen & Cline 1987 in two dimensions (common practice).
///
/// @param field  rows x columns
std::vector<Polyline> level_lines(const Eigen::ArrayXXd& field, double level);

}  // namespace deviascope
