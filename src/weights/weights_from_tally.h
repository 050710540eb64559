// SPDX-License-Identifier: GPL-2.0-or-later
// WEIGHTS (private): from counts in cells to weights and their covariance
#pragma once

#include "deviascope/counts/survey_input.h"
#include "deviascope/weights/measured_weights.h"
#include "weights/crossing_tally.h"
#include "weights/edge_window.h"

namespace deviascope {

/// Which windows of an edge are used.
enum class WindowWidth { chosen, half, twice };

/// Chooses windows, fits the densities of the catalogue and of every replicate, and puts
/// weights together:
///
///   B = 2 + sum over the edges of  s v f(edge) <1 + alpha> / N
///
/// s = 1 at a lower and -1 at an upper end, v the displacement of y (displacement.h), f the
/// density in y of the sources inside all other sides, <1 + alpha> their mean at the edge (flux
/// and magnitude), N the sources in the bin.
class WeightEstimator {
  public:
    /// @param one_plus_alpha  the same for every source; NaN where the tally has its sums
    /// @param sums  outlives the estimator, as `boxes` does
    WeightEstimator(const Boxes& boxes, const CrossingTally& sums, double one_plus_alpha);

    /// The same with the windows of another estimator.
    WeightEstimator(const Boxes& boxes,
                    const CrossingTally& sums,
                    double one_plus_alpha,
                    const WeightEstimator& windows);

    const EdgePlan& plan(std::size_t edge) const { return plans_[edge]; }
    /// What an edge adds to the weight of its box; NaN where a fit fails.
    double term(std::size_t edge, std::size_t replicate, WindowWidth width) const;
    /// The weights of all boxes; NaN where a fit fails.
    std::vector<double> weights(std::size_t replicate, WindowWidth width) const;
    /// The fitted density at an edge of the catalogue itself.
    const std::optional<FittedDensity>& density(std::size_t edge) const {
        return densities_[edge];
    }
    /// <1 + alpha> at an edge of the catalogue itself.
    double index_at_edge(std::size_t edge) const {
        return mean_index(edge, 0, plans_[edge].window);
    }

  private:
    void fit_catalogue();
    /// Sources that cross an edge upwards per ln delta: v f <1 + alpha>; NaN where a fit fails.
    double rate(std::size_t edge, std::size_t replicate, WindowWidth width) const;
    double mean_index(std::size_t edge, std::size_t replicate, const EdgeWindow& window) const;

    const Boxes& boxes_;
    const CrossingTally& sums_;
    double one_plus_alpha_;
    std::vector<EdgePlan> plans_;
    std::vector<std::optional<FittedDensity>> densities_;
};

}  // namespace deviascope
