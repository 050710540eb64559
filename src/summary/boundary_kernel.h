// SPDX-License-Identifier: GPL-2.0-or-later
// chain -> SUMMARY -> figures
#pragma once

#include <Eigen/Core>
#include <limits>
#include <vector>

#include "deviascope/summary/line_density.h"

namespace deviascope {

/// Kernel sums along one axis of an even grid, plain and of first moment, with the kernel's
/// moments a_0, a_1, a_2 inside a support (symbols of summary/line_density.h).
class AxisKernel {
  public:
    /// @param first, step, size  of the grid; a node at each end of the support inside it
    AxisKernel(double first, double step, Eigen::Index size, double bandwidth, Support support);

    Eigen::Index size() const { return size_; }
    double node(Eigen::Index at) const { return first_ + step_ * static_cast<double>(at); }
    /// Nodes and shares of a value (linear binning); the value lies on the grid.
    struct Share {
        Eigen::Index lower;
        double upper_share;
    };
    Share share_of(double value) const;

    /// Sum of kernels over binned weights: K((x - X)/h)/h.
    Eigen::ArrayXd plain(const Eigen::ArrayXd& binned) const;
    /// The linear boundary kernel in its place: (a_2 - a_1 u) K(u) / (a_0 a_2 - a_1^2).
    Eigen::ArrayXd linear(const Eigen::ArrayXd& binned) const;
    /// a_0 at each node.
    const Eigen::ArrayXd& mass() const { return a0_; }

  private:
    Eigen::ArrayXd sum(const Eigen::ArrayXd& binned, const Eigen::ArrayXd& kernel) const;

    double first_, step_;
    Eigen::Index size_, reach_;
    Eigen::ArrayXd kernel_, first_moment_;  ///< -reach … reach
    Eigen::ArrayXd a0_, a1_, a2_;
};

/// f0 exp(f_lin / f0 - 1), 0 where f0 is.
double non_negative(double f0, double f_linear);

/// Standard deviation, or IQR/1.349 where that is smaller and not 0.
double robust_spread(std::vector<double> values);

}  // namespace deviascope
