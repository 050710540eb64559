// SPDX-License-Identifier: GPL-2.0-or-later
// WEIGHTS (private): the measured weights against an experiment on the full sky
#pragma once

#include <array>
#include <vector>

#include "deviascope/weights/measure_weights.h"
#include "weights/weights_from_tally.h"

namespace deviascope {

/// Gives every source a random place on the full sky, isotropic for an observer at rest (stream
/// (seed, sky_experiment; source, survey, 0)), moves the observer with a large velocity, boosts
/// positions and properties exactly, cuts, bins, and finds the dipole of each bin.
class SkyExperimentTally {
  public:
    SkyExperimentTally(const Boxes& boxes, const WeighOptions& options, double one_plus_alpha);

    void add(const SourceBatch& batch);

    /// The dipole along the velocity against what the fitted densities let expect for the same
    /// boost. Where the catalogue ends at an edge, sources that would come in from beyond are
    /// not there: then only the directions are used in which none would come (delta below 1, or
    /// above), and the dipole is that of a density 1 + D mu over them.
    ///
    ///   expected counts per mu': delta^2 N(ln delta), N(u) = N prod over sides of
    ///   [1 + sum over the side's edges of s int_(-v u)^0 f(y) dy / N]
    ///
    /// @param weight_sd  of the box's weight; enters the error of the difference
    SkyExperiment result(std::size_t box,
                         const WeightEstimator& estimator,
                         const CrossingTally& sums,
                         double weight_sd) const;

  private:
    enum Region : std::size_t { receding, approaching, full_sky };  ///< delta < 1, > 1, all
    /// Sums over the sources found in a box in a region.
    struct Moments {
        double n = 0.0, mu = 0.0, n_squared = 0.0, mu_squared = 0.0;
        void add(double weight, double cosine);
        void add(const Moments& other);
    };
    using Found = std::vector<std::array<Moments, 2>>;  ///< [box][receding, approaching]

    void look_at_row(const SourceBatch& batch, std::size_t row, Found& found) const;
    double boosted(const SourceBatch& batch,
                   std::size_t row,
                   std::size_t dimension,
                   double delta) const;
    double cosine_without_shift() const;
    std::array<double, 2> limits_of(Region region) const;
    Region region_of(std::size_t box,
                     const WeightEstimator& estimator,
                     const CrossingTally& sums,
                     bool& possible) const;
    /// Sources that a shift carries into a box across one edge (less those it carries out), in
    /// units of the n in the box.
    double share_moved_across(std::size_t edge,
                              const WeightEstimator& estimator,
                              double n,
                              double log_delta) const;
    /// Density of sources of a box at a cosine from the motion, up to a constant.
    double expected_count(std::size_t box,
                          const WeightEstimator& estimator,
                          double n,
                          double cosine) const;
    double expected_mean(std::size_t box,
                         const WeightEstimator& estimator,
                         const CrossingTally& sums,
                         Region region) const;

    const Boxes& boxes_;
    WeighOptions options_;
    double one_plus_alpha_;
    double beta_, gamma_;
    Found found_;
};

}  // namespace deviascope
