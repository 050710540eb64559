// SPDX-License-Identifier: GPL-2.0-or-later
#include "deviascope/model/vector_prior.h"

#include <Eigen/LU>
#include <boost/math/distributions/chi_squared.hpp>
#include <catch2/catch.hpp>
#include <cmath>
#include <numbers>
#include <vector>

#include "deviascope/core/error.h"
#include "kolmogorov.h"

using namespace deviascope;

namespace {

constexpr int n_draws = 20000;
constexpr double kolmogorov_bound = 1.949;  // probability 0.001

std::vector<Eigen::Vector3d> draws_of(const VectorPrior& prior, std::uint64_t seed) {
    std::vector<Eigen::Vector3d> draws;
    for (std::uint64_t draw = 0; draw < n_draws; ++draw) {
        Stream stream(seed, Purpose::test, 0, draw, 0);
        draws.push_back(prior.draw(stream));
    }
    return draws;
}

double distance_of(const std::vector<Eigen::Vector3d>& draws,
                   const std::function<double(const Eigen::Vector3d&)>& number,
                   const std::function<double(double)>& cumulative) {
    std::vector<double> values;
    for (const Eigen::Vector3d& draw : draws) values.push_back(number(draw));
    return kolmogorov_distance(values, cumulative);
}

GaussianPrior slanted_gaussian() {
    GaussianPrior prior;
    prior.mean = {0.02, -0.01, 0.005};
    prior.covariance << 4e-4, 1e-4, -5e-5, 1e-4, 2e-4, 3e-5, -5e-5, 3e-5, 1e-4;
    return prior;
}

}  // namespace

TEST_CASE("the measured CMB velocity becomes the Gaussian of its published errors", "[model]") {
    // Speed, direction and errors: Planck Collaboration 2018 I (A&A 641, A1, 2020), Table 2, as
    // quoted by later papers. Mean and covariance: propagated apart from this program with
    // mpmath; rotation of ERFA eraG2icrs.
    const MeasuredVelocity planck{369.82, 0.11, 264.021, 0.011, 48.253, 0.005, Frame::galactic};
    const GaussianPrior galactic = gaussian_of(planck, Frame::galactic);
    const GaussianPrior icrs = gaussian_of(planck, Frame::icrs);
    const Eigen::Vector3d mean_galactic(
        -8.555761883940e-05, -8.169064395520e-04, 9.203694911493e-04);
    const Eigen::Vector3d mean_icrs(
        -1.197519603253e-03, 2.558099358408e-04, -1.491452778688e-04);
    CHECK((galactic.mean - mean_galactic).cwiseAbs().maxCoeff() < 1e-15);
    CHECK((icrs.mean - mean_icrs).cwiseAbs().maxCoeff() < 1e-15);
    Eigen::Matrix3d covariance_galactic, covariance_icrs;
    covariance_galactic << 2.53147629e-14, 4.27566176e-15, -6.36699935e-15,  //
        4.27566176e-15, 6.56910903e-14, -6.07922806e-14,                     //
        -6.36699935e-15, -6.07922806e-14, 8.00804448e-14;
    covariance_icrs << 1.27690253e-13, -2.36113600e-14, 1.52284361e-14,  //
        -2.36113600e-14, 2.58593872e-14, 3.01917053e-15,                 //
        1.52284361e-14, 3.01917053e-15, 1.75366580e-14;
    // Printed to nine digits.
    CHECK((galactic.covariance - covariance_galactic).cwiseAbs().maxCoeff() < 1e-22);
    CHECK((icrs.covariance - covariance_icrs).cwiseAbs().maxCoeff() < 1e-21);
}

TEST_CASE("a prior outside its range is refused with every fault", "[model]") {
    CHECK_THROWS_AS(VectorPrior("a", UniformVectorPrior{0.0}), UsageError);
    CHECK_THROWS_AS(VectorPrior("a", UniformAmplitudePrior{1.5}), UsageError);
    CHECK_THROWS_AS(VectorPrior("a", FixedPrior{{0.6, 0.8, 0.0}}), UsageError);
    CHECK_THROWS_WITH(VectorPrior("a", AxisPrior{{0.0, 0.0, 2.0}, -1.0}),
                      Catch::Contains("max = -1") && Catch::Contains("length 2"));
    CHECK_THROWS_AS(
        VectorPrior("a", GaussianPrior{{2.0, 0.0, 0.0}, Eigen::Matrix3d::Identity()}),
        UsageError);
    CHECK_THROWS_AS(VectorPrior("a", GaussianPrior{{0.0, 0.0, 0.0}, Eigen::Matrix3d::Zero()}),
                    UsageError);
    CHECK_NOTHROW(VectorPrior("a", UniformVectorPrior{1.0}));
}

TEST_CASE("vectors under uniform-amplitude are moved as u with v = u |u|^2 / max^2",
          "[model]") {
    const double max = 0.05;
    const VectorPrior prior("free", UniformAmplitudePrior{max});
    for (const double length : {1e-9, 1e-4, 0.01, 0.0499}) {
        const Eigen::Vector3d v = length * Eigen::Vector3d(2.0, -1.0, 2.0) / 3.0;
        const Eigen::VectorXd u = prior.coordinates_of(v);
        INFO("length " << length);
        CHECK((prior.vector_at(u) - v).norm() < 1e-14 * length);
        CHECK(u.norm() == Approx(std::cbrt(length * max * max)).epsilon(1e-13));
        // Jacobian by central differences: error about (step/|u|)^2.
        const Eigen::MatrixXd jacobian = prior.jacobian_at(u);
        for (Eigen::Index c = 0; c < 3; ++c) {
            const double step = 1e-5 * u.norm();
            Eigen::VectorXd ahead = u, behind = u;
            ahead[c] += step;
            behind[c] -= step;
            const Eigen::Vector3d slope =
                (prior.vector_at(ahead) - prior.vector_at(behind)) / (2.0 * step);
            CHECK((slope - jacobian.col(c)).norm() < 1e-9 * jacobian.norm());
        }
        // The density in the vector is that of the definition, 1 / (4 pi max v^2).
        const double density = std::exp(prior.log_density(u)) / jacobian.determinant();
        CHECK(density ==
              Approx(1.0 / (4.0 * std::numbers::pi * max * length * length)).epsilon(1e-12));
    }
    CHECK(prior.coordinates_of(Eigen::Vector3d::Zero()).norm() == 0.0);
    CHECK(std::isfinite(prior.log_density(Eigen::Vector3d::Zero())));
}

TEST_CASE("bounded priors are flat inside, nothing outside, and integrate to one", "[model]") {
    const double max = 0.3;
    const double ball = 4.0 / 3.0 * std::numbers::pi * max * max * max;
    const VectorPrior vector("a", UniformVectorPrior{max});
    const VectorPrior amplitude("b", UniformAmplitudePrior{max});
    const VectorPrior axis("c", AxisPrior{Direction(0.6, 0.0, 0.8), max});
    const VectorPrior fixed("d", FixedPrior{{0.1, 0.2, 0.3}});
    for (const double length : {0.0, 0.1, 0.2999999}) {
        const Eigen::Vector3d at = length * Eigen::Vector3d::UnitY();
        CHECK(std::exp(vector.log_density(at)) * ball == Approx(1.0).epsilon(1e-13));
        CHECK(std::exp(amplitude.log_density(at)) * ball == Approx(1.0).epsilon(1e-13));
        CHECK(std::exp(axis.log_density(Eigen::VectorXd::Constant(1, length))) * max ==
              Approx(1.0).epsilon(1e-13));
    }
    const double nothing = -std::numeric_limits<double>::infinity();
    CHECK(vector.log_density(Eigen::Vector3d(0.0, 0.3, 0.0)) == nothing);
    CHECK(amplitude.log_density(Eigen::Vector3d(0.3001, 0.0, 0.0)) == nothing);
    CHECK(axis.log_density(Eigen::VectorXd::Constant(1, -1e-12)) == nothing);
    CHECK(axis.log_density(Eigen::VectorXd::Constant(1, 0.3001)) == nothing);
    CHECK(fixed.log_density(Eigen::VectorXd(0)) == 0.0);
    CHECK(fixed.vector_at(Eigen::VectorXd(0)) == Eigen::Vector3d(0.1, 0.2, 0.3));
    CHECK(axis.coordinates_of({0.06, 0.5, 0.08})[0] == Approx(0.1));
    CHECK(vector.n_coordinates() + axis.n_coordinates() + fixed.n_coordinates() == 4);
}

TEST_CASE("the Gaussian prior is normalised and has the wall", "[model]") {
    const GaussianPrior gaussian = slanted_gaussian();
    const VectorPrior prior("g", gaussian);
    // Trapezoidal rule over 8 standard deviations a side: exact to rounding for a Gaussian.
    double sum = 0.0;
    const double step = 0.005;
    for (double x = -0.16; x <= 0.16; x += step)
        for (double y = -0.16; y <= 0.16; y += step)
            for (double z = -0.16; z <= 0.16; z += step)
                sum += std::exp(prior.log_density(gaussian.mean + Eigen::Vector3d(x, y, z)));
    CHECK(sum * step * step * step == Approx(1.0).epsilon(1e-6));
    CHECK(prior.log_density(Eigen::Vector3d(1.0, 0.0, 0.0)) ==
          -std::numeric_limits<double>::infinity());
    CHECK(prior.covariance() == gaussian.covariance);
}

TEST_CASE("draws of the bounded priors follow their densities", "[model]") {
    const double max = 0.3;
    const auto radius = [](const Eigen::Vector3d& v) { return v.norm(); };
    const auto height = [](const Eigen::Vector3d& v) { return v.z() / v.norm(); };
    const auto lon = [](const Eigen::Vector3d& v) { return std::atan2(v.y(), v.x()); };
    const auto uniform_height = [](double z) { return 0.5 * (1.0 + z); };
    const auto uniform_lon = [](double a) { return 0.5 + a / (2.0 * std::numbers::pi); };
    const auto ball = draws_of(VectorPrior("a", UniformVectorPrior{max}), 41);
    const auto amplitude = draws_of(VectorPrior("b", UniformAmplitudePrior{max}), 42);
    const auto axis = draws_of(VectorPrior("c", AxisPrior{Direction::UnitX(), max}), 43);
    CHECK(distance_of(ball, radius, [max](double r) { return std::pow(r / max, 3); }) <
          kolmogorov_bound);
    CHECK(distance_of(amplitude, radius, [max](double r) { return r / max; }) <
          kolmogorov_bound);
    CHECK(distance_of(axis, radius, [max](double r) { return r / max; }) < kolmogorov_bound);
    for (const auto& draws : {ball, amplitude}) {
        CHECK(distance_of(draws, height, uniform_height) < kolmogorov_bound);
        CHECK(distance_of(draws, lon, uniform_lon) < kolmogorov_bound);
    }
}

TEST_CASE("draws of a Gaussian have chi-squared distances and stay inside the wall",
          "[model]") {
    const GaussianPrior gaussian = slanted_gaussian();
    const boost::math::chi_squared_distribution<double> chi_squared(3.0);
    const Eigen::Matrix3d precision = gaussian.covariance.inverse();
    const auto squared = [&](const Eigen::Vector3d& v) {
        return (v - gaussian.mean).dot(precision * (v - gaussian.mean));
    };
    const auto draws = draws_of(VectorPrior("g", gaussian), 44);
    CHECK(distance_of(draws, squared, [&](double x) {
              return boost::math::cdf(chi_squared, x);
          }) < kolmogorov_bound);
    const VectorPrior wide("w", GaussianPrior{{0.0, 0.0, 0.0}, Eigen::Matrix3d::Identity()});
    for (const Eigen::Vector3d& draw : draws_of(wide, 45)) REQUIRE(draw.norm() < 1.0);
}

TEST_CASE(
    "a Gaussian that hardly ever lies inside the wall says so instead of drawing for ever",
    "[model]") {
    const VectorPrior vast("vast",
                           GaussianPrior{{0, 0, 0}, 1e12 * Eigen::Matrix3d::Identity()});
    Stream stream(48, Purpose::test, 0, 0, 0);
    CHECK_THROWS_WITH(vast.draw(stream),
                      Catch::Contains("prior vast: none of 1000000 draws is shorter than 1"));
}

TEST_CASE("the change of a vector with its coordinates is that of differences", "[model]") {
    const std::vector<VectorPrior> priors = {
        VectorPrior("a", UniformVectorPrior{0.3}),
        VectorPrior("b", UniformAmplitudePrior{0.3}),
        VectorPrior("c", AxisPrior{Direction(0.6, 0.0, 0.8), 0.3}),
        VectorPrior("d", slanted_gaussian()),
        VectorPrior("e", FixedPrior{{0.1, 0.0, 0.0}})};
    for (const VectorPrior& prior : priors) {
        INFO(prior.kind_name());
        const Eigen::VectorXd at =
            Eigen::Vector3d(0.11, -0.07, 0.13).head(prior.n_coordinates());
        const Eigen::MatrixXd jacobian = prior.jacobian_at(at);
        REQUIRE(jacobian.rows() == 3);
        REQUIRE(jacobian.cols() == prior.n_coordinates());
        // Central differences of step h: an error of order h^2, and rounding / h.
        constexpr double h = 1e-5;
        for (Eigen::Index k = 0; k < at.size(); ++k) {
            const Eigen::VectorXd step = h * Eigen::VectorXd::Unit(at.size(), k);
            const Eigen::Vector3d difference =
                (prior.vector_at(at + step) - prior.vector_at(at - step)) / (2.0 * h);
            CHECK((jacobian.col(k) - difference).cwiseAbs().maxCoeff() < 1e-8);
        }
    }
}

TEST_CASE("median amplitudes are exact where they are closed", "[model]") {
    CHECK(VectorPrior("a", UniformVectorPrior{0.05}).median_amplitude(1) ==
          Approx(0.05 * std::pow(0.5, 1.0 / 3.0)).epsilon(1e-14));
    CHECK(VectorPrior("b", UniformAmplitudePrior{0.05}).median_amplitude(1) == Approx(0.025));
    CHECK(VectorPrior("c", AxisPrior{Direction::UnitX(), 0.05}).median_amplitude(1) ==
          Approx(0.025));
    CHECK(VectorPrior("d", FixedPrior{{0.03, 0.04, 0.0}}).median_amplitude(1) == Approx(0.05));
    // Median of Maxwell's distribution of scale sqrt(3): 2.6641924955 (scipy.stats.maxwell).
    const VectorPrior gaussian(
        "e", GaussianPrior{{0.0, 0.0, 0.0}, 3e-4 * Eigen::Matrix3d::Identity()});
    CHECK(gaussian.median_amplitude(1) == Approx(0.026641924955).epsilon(1e-10));
}

TEST_CASE("other median amplitudes come from keyed draws", "[model]") {
    // A Gaussian far from 0 along x with unlike widths: |v| is about Normal(mean, sd_x).
    GaussianPrior narrow;
    narrow.mean = {0.1, 0.0, 0.0};
    narrow.covariance = Eigen::Vector3d(1e-4, 1e-8, 1e-8).asDiagonal();
    const VectorPrior prior("narrow", narrow);
    // Standard error of the median: 1.2533 sd / sqrt(n) = 4e-5; four of them allowed.
    CHECK(prior.median_amplitude(5) == Approx(0.1).margin(1.6e-4));
    CHECK(prior.median_amplitude(5) == prior.median_amplitude(5));
    CHECK(prior.median_amplitude(5) != prior.median_amplitude(6));
    // Its centre being at 0 but unequal widths must not take the closed form.
    GaussianPrior flat;
    flat.covariance = Eigen::Vector3d(1e-4, 1e-12, 1e-12).asDiagonal();
    // |v| is about |Normal(0, sd)|: median 0.67449 sd, standard error 0.79 sd / sqrt(n).
    CHECK(VectorPrior("flat", flat).median_amplitude(7) == Approx(6.7449e-3).margin(1.2e-4));
}

TEST_CASE("prior covariances are those of the draws", "[model]") {
    const std::vector<VectorPrior> priors = {
        VectorPrior("a", UniformVectorPrior{0.3}),
        VectorPrior("b", UniformAmplitudePrior{0.3}),
        VectorPrior("c", AxisPrior{Direction(0.6, 0.0, 0.8), 0.3}),
        VectorPrior("d", slanted_gaussian())};
    for (const VectorPrior& prior : priors) {
        const auto draws = draws_of(prior, 46);
        Eigen::Vector3d mean = Eigen::Vector3d::Zero();
        for (const Eigen::Vector3d& v : draws) mean += v / n_draws;
        Eigen::Matrix3d covariance = Eigen::Matrix3d::Zero();
        for (const Eigen::Vector3d& v : draws)
            covariance += (v - mean) * (v - mean).transpose() / n_draws;
        // Relative standard error of a variance is at most sqrt(2 / n) = 1 %; five allowed.
        INFO(prior.kind_name());
        CHECK((covariance - prior.covariance()).cwiseAbs().maxCoeff() <
              0.05 * prior.covariance().maxCoeff());
    }
}
