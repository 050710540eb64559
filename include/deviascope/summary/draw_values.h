// SPDX-License-Identifier: GPL-2.0-or-later
// chain -> SUMMARY -> figures
#pragma once

#include <Eigen/Core>
#include <cstdint>
#include <string>
#include <vector>

#include "deviascope/core/parameter.h"
#include "deviascope/ensemble/diagnostics.h"
#include "deviascope/ensemble/draws.h"
#include "deviascope/sky/direction.h"

namespace deviascope {

/// All stored draws, n_draws x n_parameters, in the order (row, replicate, walker).
using DrawRows =
    Eigen::Map<const Eigen::Matrix<double, Eigen::Dynamic, Eigen::Dynamic, Eigen::RowMajor>>;
DrawRows rows_of(const Draws& draws);

std::vector<double> column_of(const DrawRows& rows, Eigen::Index parameter);

/// The mean of all draws, parameter by parameter.
Eigen::VectorXd mean_row(const Draws& draws);

/// Lengths of the vector whose x component stands at `first`.
std::vector<double> amplitudes_of(const DrawRows& rows, Eigen::Index first);

/// Unit vectors of the draws; vectors of length zero have none and are left out.
struct Directions {
    std::vector<Direction> unit;
    std::int64_t left_out = 0;
};
Directions directions_of(const DrawRows& rows, Eigen::Index first);

/// Independent draws of a scalar, for the width of a density estimate: its bulk effective size;
/// one a walker where the run is too short to tell, or the scalar is not watched.
/// @param scalars  diagnostics, by name
double effective_values(const std::string& name,
                        const std::vector<ScalarDiagnostics>& scalars,
                        const Draws& draws);

/// The same of a vector's direction: the fewest of its components.
double effective_directions(const VectorParameter& vector,
                            const std::vector<ScalarDiagnostics>& scalars,
                            const Draws& draws);

}  // namespace deviascope
