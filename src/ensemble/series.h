// SPDX-License-Identifier: GPL-2.0-or-later
// ENSEMBLE, inside: the stored values of the scalars that are watched
#pragma once

#include <Eigen/Core>
#include <cstdint>
#include <span>
#include <vector>

#include "deviascope/core/large_array.h"
#include "deviascope/ensemble/diagnostics.h"
#include "deviascope/ensemble/draws.h"
#include "deviascope/ensemble/monitored.h"

namespace deviascope {

/// Sizes of what is looked at.
struct SeriesShape {
    Eigen::Index n_replicates = 0;
    Eigen::Index n_walkers = 0;  ///< per replicate, all of them
    Eigen::Index n_looked = 0;   ///< per replicate, those looked at

    Eigen::Index n_chains() const { return n_replicates * n_looked; }
};
SeriesShape series_shape(Eigen::Index n_replicates, Eigen::Index n_walkers);

/// Values of one scalar in rows first … last-1, of the walkers looked at:
/// rows x replicates x walkers looked at, the last index fastest. Appended to `series`.
void append_series(const MonitoredScalar& scalar,
                   const Draws& draws,
                   Eigen::Index first_row,
                   Eigen::Index last_row,
                   LargeArray& series);

class ScoreTables;

/// Diagnostics of one scalar from its series.
ScalarDiagnostics diagnose_series(const std::string& name,
                                  std::span<const double> series,
                                  const SeriesShape& shape,
                                  std::int64_t steps_per_row,
                                  const ScoreTables& tables);

}  // namespace deviascope
