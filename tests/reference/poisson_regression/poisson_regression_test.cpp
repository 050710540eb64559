// SPDX-License-Identifier: GPL-2.0-or-later
// Values: see README.md of this folder.
#include <Eigen/Cholesky>
#include <Eigen/LU>
#include <catch2/catch.hpp>
#include <cmath>
#include <limits>
#include <numeric>

#include "deviascope/model/information.h"
#include "deviascope/model/posterior.h"
#include "poisson_data.h"

using namespace deviascope;

namespace {

using Columns = std::vector<Eigen::Index>;

/// Fisher's scoring over some parameters (monopoles as ln M), from a given row.
Eigen::VectorXd maximum(const Counts& counts,
                        const ParameterSpace& space,
                        Eigen::VectorXd row,
                        const Columns& free) {
    const Columns monopoles = [&] {
        Columns all;
        for (const BinTerm& term : space.terms()) all.push_back(term.monopole);
        return all;
    }();
    for (int round = 0; round < 60; ++round) {
        for (const Eigen::Index monopole : monopoles)
            row[monopole] = std::numeric_limits<double>::quiet_NaN();
        const Derivatives at = derivatives(counts, space, row);
        const Eigen::MatrixXd information = eliminate(at.information, free, monopoles);
        const Eigen::VectorXd score = at.score(free);
        const Eigen::VectorXd step = information.llt().solve(score);
        for (std::size_t k = 0; k < free.size(); ++k)
            row[free[k]] += step[static_cast<Eigen::Index>(k)];
    }
    return row;
}

Columns range(Eigen::Index first, Eigen::Index n) {
    Columns columns(static_cast<std::size_t>(n));
    std::iota(columns.begin(), columns.end(), first);
    return columns;
}

/// ln L without factorials of the isotropic sky at its best monopole.
double isotropic(const Counts& counts) {
    double sum = 0.0;
    for (const BinCounts& bin : counts.surveys[0].bins) {
        const double n = static_cast<double>(bin.total());
        sum += n * std::log(n / static_cast<double>(bin.count.size())) - n;
    }
    return sum;
}

struct Linear {
    Eigen::Vector3d dipole;
    double mean;  ///< A, a pixel
    double log_likelihood;
    double var_mean;
    Eigen::Matrix3d covariance;
};

void check_linear_fit(double least_height, const Linear& expected) {
    const Counts counts = poisson_data::make_counts({poisson_data::first_bin()}, least_height);
    ModelOptions options = poisson_data::make_model({2.5});
    options.velocity = VectorPrior("still", FixedPrior{});
    options.monopole.sampled = true;
    const Posterior posterior(counts, options);
    const ParameterSpace& space = posterior.space();
    Eigen::VectorXd row = Eigen::VectorXd::Zero(space.n_parameters());
    row[6] = 2.5;
    row = maximum(counts, space, row, range(3, 3));
    CHECK((row.segment<3>(3) - expected.dipole).cwiseAbs().maxCoeff() < 1e-12);
    const double omega = Pixelisation(8).solid_angle();
    row[7] = expected.mean / omega;
    CHECK(std::abs(derivatives(counts, space, row).score[7]) <
          1e-4);  // A to its printed digits
    Eigen::VectorXd posterior_value(1), likelihood(1);
    posterior.log_density(space.to_coordinates(row), posterior_value, likelihood);
    CHECK(likelihood[0] + isotropic(counts) ==
          Approx(expected.log_likelihood).margin(2e-8).epsilon(0));
    const Columns free = {3, 4, 5, 7};
    const Eigen::MatrixXd covariance =
        Eigen::MatrixXd(expected_information(counts, space, row)(free, free)).inverse();
    const double mean_squared = expected.mean * expected.mean;
    CHECK(mean_squared * covariance(3, 3) == Approx(expected.var_mean).epsilon(1e-9));
    CHECK((covariance.topLeftCorner(3, 3) - expected.covariance).cwiseAbs().maxCoeff() < 1e-14);
}

Eigen::Matrix3d symmetric(double xx, double yy, double zz, double xy, double xz, double yz) {
    Eigen::Matrix3d matrix;
    matrix << xx, xy, xz, xy, yy, yz, xz, yz, zz;
    return matrix;
}

}  // namespace

TEST_CASE("a lone bin at rest reproduces the linear Poisson regression", "[model]") {
    check_linear_fit(-1.0,
                     {{-6.576533028450e-02, -3.300784072393e-02, 6.573122039146e-02},
                      202.4934895833,
                      670632.2121008766,
                      2.6366339789e-01,
                      symmetric(1.9205768491e-05,
                                1.9230725089e-05,
                                1.9247714259e-05,
                                -1.6743712466e-08,
                                3.3453725447e-08,
                                1.6790538277e-08)});
    check_linear_fit(0.5,
                     {{-6.530526748355e-02, -3.297543990426e-02, 6.570403641200e-02},
                      202.4943181818,
                      307390.1680432134,
                      5.7526794938e-01,
                      symmetric(7.1908549561e-05,
                                7.1965391283e-05,
                                2.2862701196e-05,
                                -3.8525265536e-08,
                                9.9573267003e-08,
                                5.0278830528e-08)});
}

TEST_CASE("two bins give the published-form maximum of velocity and dipole", "[model]") {
    const Counts counts =
        poisson_data::make_counts({poisson_data::first_bin(), poisson_data::second_bin()});
    REQUIRE(counts.surveys[0].bins[0].total() == 155515);
    REQUIRE(counts.surveys[0].bins[1].total() == 77950);
    ModelOptions options = poisson_data::make_model({2.5, 6.0});
    const Posterior integrated(counts, options);
    options.monopole.sampled = true;
    const Posterior sampled(counts, options);
    const ParameterSpace& space = sampled.space();
    const double omega = Pixelisation(8).solid_angle();
    const auto log_likelihood = [](const Posterior& posterior, const Eigen::VectorXd& row) {
        Eigen::VectorXd value(1), likelihood(1);
        posterior.log_density(posterior.space().to_coordinates(row), value, likelihood);
        return likelihood[0];
    };
    Eigen::VectorXd row = Eigen::VectorXd::Zero(space.n_parameters());
    row[6] = 2.5;
    row[7] = 6.0;
    row = maximum(counts, space, row, range(0, 6));

    const Eigen::Vector3d beta(3.22844387113e-2, 3.70303650760e-2, 9.3846291512e-3);
    const Eigen::Vector3d dipole(-.1444420802955, -.1239518292043, .041467054183);
    CHECK((row.head<3>() - beta).cwiseAbs().maxCoeff() < 2e-13);
    CHECK((row.segment<3>(3) - dipole).cwiseAbs().maxCoeff() < 2e-13);
    CHECK(log_likelihood(integrated, row) == Approx(531.2246314039).margin(2e-9).epsilon(0));
    const Eigen::MatrixXd covariance =
        eliminate(expected_information(counts, space, row), range(0, 6), range(8, 2)).inverse();
    Eigen::VectorXd variances(6);
    variances << 4.6350056814e-6, 4.6352226256e-6, 4.6443366008e-6, 7.2451530348e-5,
        7.2758814968e-5, 7.3706332211e-5;
    CHECK((covariance.diagonal() - variances).cwiseQuotient(variances).cwiseAbs().maxCoeff() <
          1e-9);
    CHECK(covariance(0, 3) / std::sqrt(covariance(0, 0) * covariance(3, 3)) ==
          Approx(-0.910452040200).margin(1e-11));

    row.tail<2>() = Eigen::Vector2d(203.895145032027, 102.294831137210) / omega;
    CHECK(log_likelihood(sampled, row) + isotropic(counts) ==
          Approx(953092.5215353905).margin(2e-8).epsilon(0));

    row << 1e-3, -2e-3, 3e-3, -.05, .01, .04, 2.5, 6.0, 203.0 / omega, 102.0 / omega;
    CHECK(log_likelihood(sampled, row) + isotropic(counts) ==
          Approx(952775.2287817535).margin(2e-8).epsilon(0));
    CHECK(log_likelihood(integrated, row) == Approx(215.4485344364).margin(2e-9).epsilon(0));
}
