// SPDX-License-Identifier: GPL-2.0-or-later
#include "summary/weight_modes.h"

#include <Eigen/Cholesky>
#include <catch2/catch.hpp>
#include <cmath>

using namespace deviascope;

namespace {

const Eigen::Vector3d sources(1e5, 3e5, 2e5);

WeightPrior prior_of(const Eigen::Vector3d& mean) {
    Eigen::Matrix3d covariance;
    covariance << 0.04, 0.01, 0.0, 0.01, 0.02, -0.005, 0.0, -0.005, 0.03;
    return {mean, covariance};
}

/// Two draws, a step below and above a vector of weights.
Eigen::MatrixXd draws_about(const Eigen::Vector3d& weights, const Eigen::Vector3d& step) {
    Eigen::MatrixXd draws(2, 3);
    draws.row(0) = (weights - step).transpose();
    draws.row(1) = (weights + step).transpose();
    return draws;
}

}  // namespace

TEST_CASE("an error that all weights share is a common factor", "[summary]") {
    const Eigen::Vector3d mean(3.0, 5.0, 9.0);
    const auto modes = weight_modes(
        sources, prior_of(mean), draws_about(1.02 * mean, Eigen::Vector3d::Zero()));
    CHECK(modes.common.mean == Approx(1.02).epsilon(1e-12));
    CHECK(modes.differential.mean == Approx(0.0).margin(1e-12));
    CHECK(modes.common.sd == Approx(0.0).margin(1e-12));
}

TEST_CASE("a shift of all weights is left over by the factor", "[summary]") {
    const Eigen::Vector3d mean(3.0, 5.0, 9.0);
    const Eigen::Vector3d step = Eigen::Vector3d::Constant(0.1);
    const auto modes = weight_modes(sources, prior_of(mean), draws_about(mean + step, step));
    CHECK(modes.common.mean == Approx(1.0).epsilon(1e-12));
    CHECK(modes.differential.mean == Approx(0.1).epsilon(1e-12));
    CHECK(modes.differential.sd == Approx(0.1 * std::sqrt(2.0)).epsilon(1e-12));
}

TEST_CASE("the modes do to a fit what they say", "[summary]") {
    // The dipole B beta + D of each bin, fitted with other weights by weighted least squares.
    const Eigen::Vector3d assumed(3.0, 5.0, 9.0);
    const Eigen::Vector3d actual(3.1, 4.7, 9.4);
    const double beta = 0.004, dipole = 0.02;
    Eigen::MatrixXd design(3, 2);
    design << assumed, Eigen::Vector3d::Ones();
    const Eigen::Vector3d found = beta * actual + Eigen::Vector3d::Constant(dipole);
    const Eigen::Vector2d fit = (design.transpose() * sources.asDiagonal() * design)
                                    .ldlt()
                                    .solve(design.transpose() * sources.asDiagonal() * found);
    const auto modes =
        weight_modes(sources, prior_of(assumed), draws_about(actual, Eigen::Vector3d::Zero()));
    CHECK(fit[0] / beta == Approx(modes.common.mean).epsilon(1e-10));
    CHECK((fit[1] - dipole) / beta == Approx(modes.differential.mean).epsilon(1e-9));
}

TEST_CASE("the prior of the modes follows from the covariance of the weights", "[summary]") {
    const Eigen::Vector3d mean(3.0, 5.0, 9.0);
    const WeightPrior prior = prior_of(mean);
    // The forms, from their action on the unit vectors.
    Eigen::Vector3d factor, shift;
    for (Eigen::Index b = 0; b < 3; ++b) {
        const auto unit = weight_modes(
            sources, prior, draws_about(Eigen::Vector3d::Unit(b), Eigen::Vector3d::Zero()));
        factor[b] = unit.common.mean;
        shift[b] = unit.differential.mean;
    }
    const auto modes = weight_modes(sources, prior, draws_about(mean, Eigen::Vector3d::Ones()));
    CHECK(modes.common.prior_sd ==
          Approx(std::sqrt(factor.dot(prior.covariance * factor))).epsilon(1e-12));
    CHECK(modes.differential.prior_sd ==
          Approx(std::sqrt(shift.dot(prior.covariance * shift))).epsilon(1e-12));
}

TEST_CASE("equal weights have a common factor only", "[summary]") {
    const Eigen::Vector3d mean = Eigen::Vector3d::Constant(4.0);
    const auto modes =
        weight_modes(sources, prior_of(mean), draws_about(1.1 * mean, Eigen::Vector3d::Zero()));
    CHECK(modes.common.mean == Approx(1.1).epsilon(1e-12));
    CHECK(modes.differential.mean == 0.0);
    CHECK(modes.differential.prior_sd == 0.0);
}
