// SPDX-License-Identifier: GPL-2.0-or-later
// chain -> SUMMARY -> figures
#pragma once

#include <Eigen/Core>
#include <array>
#include <span>
#include <vector>

#include "deviascope/summary/line_density.h"

namespace deviascope {

/// The density of a pair of scalars from their draws, on a grid; levels are quantiles of the
/// density at the draws themselves.
///
/// Bandwidth h = 1.2 n_eff^(-1/6) standard deviations. Where neither scalar comes near an end
/// of its support, the kernel has the shape of the draws' own covariance (the grid is whitened:
/// Cholesky, y after x); else it is along the axes, with the boundary form of
/// summary/line_density.h in each axis. 129 x 129 nodes.
/// Domain: both scalars vary, and the pair does not lie on a line (correlation below 1 - 1e-9
/// in size); else `is_defined` is false and nothing may be asked.
/// Accuracy (tests): the region above level(P) truly holds P within 0.01 at 20,000 independent
/// draws of a Gaussian. Threads: pure.
class PlaneDensity {
  public:
    PlaneDensity(std::span<const double> x,
                 std::span<const double> y,
                 double effective_draws,
                 const std::array<Support, 2>& supports = {});

    bool is_defined() const { return density_.size() > 0; }
    /// Density at node (row: second grid axis, column: first), in relative units.
    const Eigen::ArrayXXd& grid() const { return density_; }
    /// The pair (x, y) at a place of the grid, in cells: node (column, row) is at (column,
    /// row).
    Eigen::Vector2d pair_at(double column, double row) const;
    /// Value of the grid by bilinear interpolation; 0 outside.
    double at(double x, double y) const;
    /// Value that holds a probability of the draws above it.
    double level(double probability) const;

  private:
    Eigen::Vector2d place_of(double x, double y) const;  ///< in cells
    void lay_grid(const Eigen::Matrix2Xd& whitened, const std::array<Support, 2>& supports);

    Eigen::Vector2d mean_ = Eigen::Vector2d::Zero();
    Eigen::Matrix2d factor_ = Eigen::Matrix2d::Identity();  ///< pair = mean + factor * whitened
    Eigen::Array2d corner_ = Eigen::Array2d::Zero(), cell_ = Eigen::Array2d::Ones();
    Eigen::ArrayXXd density_;
    std::vector<double> at_draws_;  ///< falling
};

}  // namespace deviascope
