// SPDX-License-Identifier: GPL-2.0-or-later
// WEIGHTS (private): what measurement scatter does to the weights
#pragma once

#include <Eigen/Core>
#include <array>
#include <vector>

#include "deviascope/weights/measure_weights.h"
#include "weights/weights_from_tally.h"

namespace deviascope {

/// Weights that the catalogue would have without measurement scatter, by simulation and
/// extrapolation (Cook & Stefanski 1994, J. Am. Stat. Assoc. 89, 1314): scatter of a variance
/// lambda times that of the measurement is added to the sources, for lambda = 1/2, 1, 3/2 and
/// 2; the weights as a function of lambda, a parabola by least squares, are extrapolated from
/// the catalogue itself, lambda = 0, to lambda = -1.
///
/// Scatter is added in the coordinate y of a property (displacement.h), where it commutes with
/// the boost: flux a fraction, size and redshift over the value, over 1 + z. Numbers: stream
/// (seed, added_scatter; source, survey, 0), one normal for each dimension.
///
/// Replicates: the first of the bootstrap of the catalogue, with the same multiplicities, 50 at
/// most (a standard deviation is then known to a tenth).
class ScatterFreeTally {
  public:
    ScatterFreeTally(const Boxes& boxes,
                     const SourcePhysics& physics,
                     const WeighOptions& options,
                     bool index_varies,
                     bool weights_vary);

    /// Whether any property that the boxes select on scatters.
    bool has_scatter() const;
    void add(const SourceBatch& batch);
    /// Weights of the boxes without scatter, (1 + replicates) x boxes: row 0 of the catalogue,
    /// then of the replicates of the bootstrap. NaN where a fit fails.
    Eigen::MatrixXd weights(const WeightEstimator& observed, double one_plus_alpha) const;

  private:
    struct Level {
        double lambda;
        CrossingTally tally;
    };
    double sd_of(std::size_t dimension, double value) const;

    const Boxes& boxes_;
    WeighOptions options_;
    std::vector<PropertyError> error_;  // of each dimension; amount 0: none
    std::vector<Level> levels_;
};

/// Fitted over true velocity of a survey whose bins have dipoles `observed` times beta where
/// `assumed` times beta is fitted: n sources in each, by least squares with weights n.
ScatterShift shift_of_velocity(const std::vector<double>& n,
                               const std::vector<double>& observed,
                               const std::vector<double>& assumed);

}  // namespace deviascope
