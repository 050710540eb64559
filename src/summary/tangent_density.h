// SPDX-License-Identifier: GPL-2.0-or-later
// chain -> SUMMARY -> figures
#pragma once

#include "summary/sky_density.h"

namespace deviascope {

/// Lambert's azimuthal equal-area plane about a centre: x = t sqrt(2 / (1 + c)) with c the
/// cosine of the distance from the centre and t the part of the direction at right angles to
/// it. Areas are kept; the antipode is the rim |x| = 2.
/// Source: Snyder 1987, Map Projections: A Working Manual, USGS Professional Paper 1395,
/// p. 182 (from memory).
class TangentPlane {
  public:
    explicit TangentPlane(const Direction& centre);
    Eigen::Vector2d project(const Direction& direction) const;

  private:
    Direction centre_, first_axis_, second_axis_;
};

/// Density of a compact posterior: Gaussian kernel in whitened Lambert coordinates about the
/// mean direction, binned and smoothed on a grid, read by bilinear interpolation.
///
///   bandwidth  h = 1.2 n_eff^(-1/6)    in whitened units
///
/// Whitening: mean and covariance of the central 90 % of the draws (by whitened radius, three
/// rounds), scaled to those of a whole Gaussian, so that a few far draws do not swell the core
/// (Rousseeuw & Van Driessen 1999, Technometrics 41, 212, "concentration steps"; from memory).
/// There is no smallest bandwidth: the grid follows the draws to any scale. Cell h/4, at most
/// 1024 cells a side; draws farther out than ten standard deviations and the 99.5 % radius
/// count as draws but carry no density (levels up to P = 0.99 are not affected).
class TangentDensity : public SkyDensity {
  public:
    TangentDensity(std::span<const Direction> draws,
                   const Direction& centre,
                   double effective_draws);

    double at(const Direction& direction) const override;
    std::vector<double> at_each(std::span<const Direction> draws) const override;
    double area_above(double level) const override;

  private:
    /// A node of the grid and how far beyond it a point lies, in cells.
    struct Place {
        Eigen::Index x, y;
        double right, upper;
    };
    /// False outside the grid.
    bool locate(const Eigen::Vector2d& whitened, Place& place) const;
    /// The same points, whitened.
    Eigen::Matrix2Xd whiten(const Eigen::Matrix2Xd& plane);
    void set_whitening(const Eigen::Vector2d& mean, const Eigen::Matrix2d& covariance);
    void lay_grid(const Eigen::Matrix2Xd& whitened, double bandwidth, double half_width);
    void smooth(const Eigen::Matrix2Xd& whitened, double bandwidth);

    TangentPlane plane_;
    Eigen::Vector2d mean_ = Eigen::Vector2d::Zero();
    Eigen::Matrix2d whitening_ = Eigen::Matrix2d::Identity();
    double steradian_per_unit_ = 1.0;  ///< area of the whitened unit square
    Eigen::Array2d corner_ = Eigen::Array2d::Zero();
    double cell_ = 1.0;
    Eigen::ArrayXXd density_;  ///< per steradian, at the nodes of the grid
};

}  // namespace deviascope
