// SPDX-License-Identifier: GPL-2.0-or-later
// MODEL, private: where the series of the moment engine may be cut
#pragma once

#include <Eigen/Core>
#include <vector>

#include "deviascope/model/moment_engine.h"
#include "model/bin_likelihood.h"

namespace deviascope {

/// The rigorous bounds of MomentEngine, as a function of one walker's parameters.
class MomentBound {
  public:
    MomentBound(const Counts& counts, const ParameterSpace& space, double tolerance);

    /// As MomentEngine::degrees_for.
    MomentEngine::Degrees degrees_for(const Eigen::Ref<const Eigen::VectorXd>& row) const;

  private:
    /// The bins that feel the same vector with the same bias ratio.
    struct Feelers {
        Eigen::Index intrinsic = 0;
        double bias_ratio = 1.0;
        double sources = 0.0;  ///< sum of N / phi
    };
    struct Extent {
        double speed = 0.0;             ///< b
        double largest_dipole = 0.0;    ///< d
        double largest_weight = 0.0;    ///< B
        double weighted_sources = 0.0;  ///< sum |B_b| N_b / phi
        double expected_scale = 0.0;    ///< what multiplies T / lower bound of E
    };

    Extent extent_of(const Eigen::Ref<const Eigen::VectorXd>& row) const;
    int velocity_degree(const Extent& extent) const;
    int intrinsic_degree(const Eigen::Ref<const Eigen::VectorXd>& row) const;

    double half_tolerance_;
    bool monopoles_sampled_;
    std::vector<BinTerm> terms_;
    std::vector<BinTotals> totals_;
    std::vector<Feelers> feelers_;
    double sources_and_shapes_ = 0.0;  ///< sum of N / phi + a
};

}  // namespace deviascope
