// SPDX-License-Identifier: GPL-2.0-or-later
// chain -> SUMMARY -> figures
#pragma once

#include <Eigen/Core>
#include <vector>

#include "deviascope/sky/pixelisation.h"
#include "summary/sky_density.h"

namespace deviascope {

/// Draws gathered in HEALPix cells: per occupied cell their number and mean vector, cells in
/// blocks of neighbours so that a kernel need not look at the whole sky.
class SphereCells {
  public:
    SphereCells(std::span<const Direction> draws, int nside);

    struct Block {
        Eigen::Index first, size;
        Direction centre;
        double radius;  ///< radians
    };
    const std::vector<Block>& blocks() const { return blocks_; }
    const Eigen::ArrayX3d& mean() const { return mean_; }     ///< n_cells x 3
    const Eigen::ArrayXd& weight() const { return weight_; }  ///< n_cells; adds to 1
    Eigen::Index size() const { return weight_.size(); }

  private:
    void gather(std::span<const Direction> draws, const Pixelisation& grid);
    void close_block(Eigen::Index first, Eigen::Index last);

    Eigen::ArrayX3d mean_;
    Eigen::ArrayXd weight_;
    std::vector<Block> blocks_;
};

/// Sum of von Mises-Fisher kernels of one width over cells of draws.
///
///   f(n) = sum_c w_c k_c / (2 pi (1 - exp(-2 k_c))) exp(kappa n.v_c - k_c),
///   kappa = 1 / h^2,  v_c the mean vector of the draws in the cell, k_c = kappa |v_c|
///
/// Each cell's kernel integrates to 1 and stands at the mean of its draws; the cells, at most
/// 0.7 h wide, blur it by at most 4 % of h^2.
///
/// Source: Hall, Watson & Cabrera 1987, Biometrika 74, 751 (from memory).
class SphereKernel {
  public:
    /// @param bandwidth  h, radians
    SphereKernel(std::span<const Direction> draws, double bandwidth);

    double at(const Direction& direction) const;
    /// Value, and gradient on the sphere (at right angles to the direction), per radian.
    double at(const Direction& direction, Eigen::Vector3d& gradient) const;
    /// Where the density is greatest.
    Direction peak() const;
    const SphereCells& cells() const { return cells_; }
    double bandwidth() const { return bandwidth_; }  ///< radians

  private:
    template <class Visit>
    void visit_near(const Direction& direction, const Visit& visit) const;

    SphereCells cells_;
    double bandwidth_, concentration_;
    Eigen::ArrayXd height_;             ///< of each cell's kernel, times its weight
    std::vector<double> block_cosine_;  ///< a block matters where the cosine is above this
};

/// Density of a wide posterior: a SphereKernel of bandwidth
///
///   h = 1.3 sigma n_eff^(-1/6),  sigma the smaller of
///   - the scale of all draws, 1/sigma^2 = R (3 - R^2) / (1 - R^2) (R: length of their mean);
///   - the scale of the densest lobe: with s = 1 - cos(distance from the peak), the mean of s
///     over draws with s < 2.5^2 s_mean / 2, solved for itself; a Gaussian lobe gives
///     0.7525 sigma^2 (derived in DEVELOPERS.md).
///
/// h is at least a cell of nside 64 (0.92 deg). Values and gradients are tabulated on a HEALPix
/// grid of nside 32 or 64 (cells below h/4) for levels and areas; `at` is the kernel sum
/// itself. Source of the first scale: Banerjee, Dhillon, Ghosh & Sra 2005, J. Mach. Learn. Res.
/// 6, 1345, Eq. 4.4 for three dimensions (from memory).
class SphereDensity : public SkyDensity {
  public:
    SphereDensity(std::span<const Direction> draws, double mean_length, double effective_draws);

    double at(const Direction& direction) const override { return kernel_.at(direction); }
    std::vector<double> at_each(std::span<const Direction> draws) const override;
    double area_above(double level) const override;

  private:
    SphereKernel kernel_;
    Pixelisation grid_;
    std::vector<Direction> centre_;
    Eigen::ArrayXd value_;       ///< at the centres
    Eigen::Matrix3Xd gradient_;  ///< at the centres
};

}  // namespace deviascope
