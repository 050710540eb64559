// SPDX-License-Identifier: GPL-2.0-or-later
// MODEL, private: the log posterior of the free parameters, as fits climb it
#pragma once

#include "model/engines.h"
#include "model/free_parameters.h"
#include "model/prior_information.h"

namespace deviascope {

/// ln L + log prior in the free parameters, flat where the prior of a vector is bounded: the
/// bound itself is a spring, -stiffness/2 times the square of the distance beyond it, so that a
/// maximum outside is found just beyond the bound, where the spring holds it.
class LogPosterior {
  public:
    LogPosterior(const Counts& counts,
                 const FreeParameters& parameters,
                 const Engines& engines);

    /// Value, gradient and minus the second derivatives.
    struct Expansion {
        double value = 0.0;
        Eigen::VectorXd gradient;
        Eigen::MatrixXd curvature;
    };
    Expansion at(const Eigen::Ref<const Eigen::VectorXd>& free) const;
    /// The value alone; -inf beyond the walls.
    double value(const Eigen::Ref<const Eigen::VectorXd>& free) const;

    /// A vector beyond the bound of its prior.
    struct Beyond {
        std::size_t vector = 0;
        double distance = 0.0;
        double bound = 0.0;       ///< the length at the bound
        Eigen::VectorXd outward;  ///< unit, n_free
    };
    std::vector<Beyond> beyond(const Eigen::Ref<const Eigen::VectorXd>& free) const;

    /// Of the spring of each vector (idle under Gaussian priors).
    std::vector<double>& stiffness() { return stiffness_; }

  private:
    void add_counts(const Eigen::Ref<const Eigen::VectorXd>& free, Expansion& all) const;
    void add_springs(const Eigen::Ref<const Eigen::VectorXd>& free, Expansion& all) const;

    const Counts& counts_;
    const FreeParameters& parameters_;
    const Engines& engines_;
    std::vector<BinTotals> totals_;
    std::vector<double> stiffness_;
};

}  // namespace deviascope
