// SPDX-License-Identifier: GPL-2.0-or-later
// ENSEMBLE, inside: the score tables one set of diagnostics needs
#pragma once

#include <vector>

#include "ensemble/normal_scores.h"
#include "ensemble/series.h"

namespace deviascope {

/// Score tables of all draws, and of those left where middle draws are left out. Made once,
/// then shared by all scalars and threads.
class ScoreTables {
  public:
    /// For chains looked at one way.
    ScoreTables(std::size_t n_draws, Eigen::Index n_chains);
    /// For series looked at walker by walker and replicate by replicate.
    ScoreTables(Eigen::Index n_rows, const SeriesShape& shape);

    /// The table of this many draws. Errors: InternalError if it was not foreseen.
    const ScoreTable& of(std::size_t n_draws) const;

  private:
    void add(std::size_t n_draws);
    void add_split(std::size_t n_draws, Eigen::Index n_chains);

    std::vector<ScoreTable> tables_;
};

}  // namespace deviascope
