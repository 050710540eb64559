// SPDX-License-Identifier: GPL-2.0-or-later
// WEIGHTS (private): the density of sources at an edge
#pragma once

#include <Eigen/Core>
#include <optional>
#include <span>
#include <vector>

namespace deviascope {

/// A fitted density near an edge: ln f(y) = sum_k coefficient_k (y / scale)^k, edge at y = 0.
struct FittedDensity {
    Eigen::VectorXd coefficient;  ///< degree + 1
    double scale = 1.0;           ///< unit of y
    double variance = 0.0;        ///< of ln f(0), from the expected information

    double at_edge() const;
    double at(double y) const;
};

/// Local-likelihood fit of a density (Loader 1996, Ann. Stat. 24, 1602; Hjort & Jones 1996,
/// Ann. Stat. 24, 1619), with weight 1 in the window and 0 outside: ln f is a polynomial there.
/// The counts of cells are Poisson with mean the integral of f over the cell (two-point
/// Gauss-Legendre; relative error of a cell below 1e-6 for cells of a tenth of the window and f
/// that changes by less than e across it). A window that ends at the edge gives the one-sided
/// fit: no kernel reaches into the region without sources, so that nothing is lost across it.
class DensityFit {
  public:
    /// @param boundary  of the cells, ascending; n_cells + 1
    /// @param degree    of the polynomial
    DensityFit(std::vector<double> boundary, int degree);

    /// Maximum of the likelihood, by Fisher scoring with halved steps.
    /// @param count  n_cells, 0 or more; need not be integers (weighted sources, replicates)
    /// @param start  where to begin; null: a constant density
    /// @return empty where the counts do not determine it (fewer cells with sources than
    ///         coefficients, or no maximum)
    std::optional<FittedDensity> fit(std::span<const double> count,
                                     const FittedDensity* start = nullptr) const;

  private:
    struct Expectation;
    Expectation expect(const Eigen::VectorXd& coefficient, std::span<const double> count) const;
    Eigen::VectorXd constant_density(std::span<const double> count) const;

    int degree_;
    double scale_;
    Eigen::Index n_cells_;
    Eigen::VectorXd weight_;  // 2 n_cells: of the nodes
    Eigen::MatrixXd power_;   // 2 n_cells x (degree + 1): powers of the nodes
};

/// Value at the edge of a polynomial fitted by weighted least squares to the mean of a quantity
/// in cells: the spectral index of the sources near an edge.
/// @param count  n_cells: sum of weights
/// @param sum    n_cells: sum of weights times the quantity
/// @return the plain mean where the cells do not determine a polynomial; NaN without sources
double mean_at_edge(const std::vector<double>& boundary,
                    std::span<const double> count,
                    std::span<const double> sum,
                    int degree);

}  // namespace deviascope
