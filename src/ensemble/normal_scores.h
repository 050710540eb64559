// SPDX-License-Identifier: GPL-2.0-or-later
// ENSEMBLE, inside: ranks and their normal scores
#pragma once

#include <cstdint>
#include <span>
#include <vector>

#include "deviascope/core/large_array.h"

namespace deviascope {

/// Normal score of average rank r among S draws (Blom 1958, as used by Vehtari et al. 2021,
/// Bayesian Analysis 16, 667, eq. 14):  z = Phi^-1((r - 3/8) / (S + 1/4)).
double normal_score(double rank, std::size_t n_draws);

/// The scores of ranks 1 … S, computed once for many scalars.
class ScoreTable {
  public:
    explicit ScoreTable(std::size_t n_draws);
    std::size_t n_draws() const { return score_.size(); }
    /// Score shared by the tied places first … last-1 (counted from 0) of the sorted draws.
    double of(std::size_t first, std::size_t last) const;

  private:
    std::vector<double> score_;
};

/// Draws in rising order, each with the place it came from.
struct Placed {
    double value;
    std::uint32_t place;
};
using PlacedDraws = std::vector<Placed, LeavesUnset<Placed>>;
PlacedDraws sorted(std::span<const double> draws);

/// Quantile of sorted draws by linear interpolation between order statistics (type 7 of Hyndman
/// & Fan 1996, American Statistician 50, 361). @param probability  0 … 1
double quantile(std::span<const Placed> sorted_draws, double probability);

/// Sorted draws turned into sorted distances from a centre, |x - centre|, places kept.
PlacedDraws folded(std::span<const Placed> sorted_draws, double centre);

/// Scores in the order of the places: result[place] = score of that draw, ties sharing the
/// score of their average rank.
LargeArray scores_by_place(std::span<const Placed> sorted_draws, const ScoreTable& table);

}  // namespace deviascope
