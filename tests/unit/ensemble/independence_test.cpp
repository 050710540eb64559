// SPDX-License-Identifier: GPL-2.0-or-later
#include "ensemble/independence.h"

#include <Eigen/LU>
#include <boost/math/distributions/normal.hpp>
#include <boost/math/distributions/students_t.hpp>
#include <catch2/catch.hpp>
#include <cmath>
#include <vector>

using namespace deviascope;

namespace {

CoordinateGaussian gaussian() {
    CoordinateGaussian made{Eigen::VectorXd(3), Eigen::MatrixXd::Zero(3, 3)};
    made.mean << 1e-7, 5.0, -2.0;
    made.factor(0, 0) = 2e-7;
    made.factor(1, 0) = 0.3;
    made.factor(1, 1) = 0.5;
    made.factor(2, 0) = -1.0;
    made.factor(2, 1) = 2.0;
    made.factor(2, 2) = 3.0;
    return made;
}

}  // namespace

TEST_CASE("in one dimension the density is 0.9 Normal + 0.1 Student-t, widened by 1.05",
          "[ensemble]") {
    // Both densities by Boost.Math.
    CoordinateGaussian line{Eigen::VectorXd::Constant(1, 3.0),
                            Eigen::MatrixXd::Constant(1, 1, 0.7)};
    const IndependenceProposal proposal(line);
    const double sd = 0.7 * std::sqrt(1.05);
    const boost::math::normal_distribution<> normal_part(3.0, sd);
    const boost::math::students_t_distribution<> student(5.0);
    for (const double x : {3.0, 2.0, 4.5, 10.0, -30.0}) {
        const double expected = 0.9 * boost::math::pdf(normal_part, x) +
                                0.1 * boost::math::pdf(student, (x - 3.0) / sd) / sd;
        CHECK(proposal.log_density(&x) == Approx(std::log(expected)).epsilon(1e-12));
    }
}

TEST_CASE("in three dimensions the density integrates to 1", "[ensemble]") {
    // By importance: the mean over draws of f / q, f a normalised Gaussian inside q.
    const CoordinateGaussian made = gaussian();
    const IndependenceProposal proposal(made);
    const Eigen::MatrixXd inverse = made.factor.inverse();
    const double log_volume = made.factor.diagonal().array().log().sum();
    double sum = 0.0, squares = 0.0;
    constexpr int n = 20000;
    for (std::uint64_t draw = 0; draw < n; ++draw) {
        Stream stream(20260817, Purpose::test, draw, 7, 0);
        Eigen::Vector3d x;
        proposal.draw(stream, x.data());
        const double f = -0.5 * (inverse * (x - made.mean)).squaredNorm() - log_volume -
                         1.5 * std::log(2.0 * 3.14159265358979323846);
        const double ratio = std::exp(f - proposal.log_density(x.data()));
        sum += ratio / n;
        squares += ratio * ratio / n;
    }
    const double error = std::sqrt((squares - sum * sum) / n);
    CHECK(error < 0.01);
    CHECK(std::abs(sum - 1.0) < 4.5 * error);
}

TEST_CASE("draws have the mean and the covariance of the mixture", "[ensemble]") {
    // Student-t with 5 degrees of freedom has variance 5/3 of its scale matrix.
    const CoordinateGaussian made = gaussian();
    const IndependenceProposal proposal(made);
    const Eigen::Matrix3d inverse = made.factor.inverse();
    Eigen::Vector3d mean = Eigen::Vector3d::Zero();
    Eigen::Matrix3d square = Eigen::Matrix3d::Zero();
    constexpr int n = 40000;
    for (std::uint64_t draw = 0; draw < n; ++draw) {
        Stream stream(20260817, Purpose::test, draw, 8, 0);
        Eigen::Vector3d x;
        proposal.draw(stream, x.data());
        const Eigen::Vector3d z = inverse * (x - made.mean);
        mean += z / n;
        square += z * z.transpose() / n;
    }
    const double variance = 1.05 * (0.9 + 0.1 * 5.0 / 3.0);
    CHECK(mean.cwiseAbs().maxCoeff() < 0.025);
    CHECK((square - variance * Eigen::Matrix3d::Identity()).cwiseAbs().maxCoeff() < 0.06);
}
