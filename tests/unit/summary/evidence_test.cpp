// SPDX-License-Identifier: GPL-2.0-or-later
#include "deviascope/summary/evidence.h"

#include <Eigen/Cholesky>
#include <Eigen/LU>
#include <boost/math/distributions/normal.hpp>
#include <catch2/catch.hpp>
#include <cmath>
#include <numbers>

#include "test_targets.h"

using namespace deviascope;

namespace {

constexpr std::uint64_t seed = 20261202;

/// A normalised Gaussian prior times a Gaussian likelihood, in any dimension.
class ConjugateTarget : public test::CoordinateTarget {
  public:
    ConjugateTarget(Eigen::VectorXd data,
                    const Eigen::MatrixXd& data_covariance,
                    const Eigen::MatrixXd& prior_covariance)
        : CoordinateTarget(data.size()),
          data_(std::move(data)),
          data_precision_(data_covariance.inverse()),
          prior_precision_(prior_covariance.inverse()),
          log_prior_normalisation_(
              -0.5 * std::log((2.0 * std::numbers::pi * prior_covariance).determinant())) {
        const Eigen::MatrixXd covariance = (data_precision_ + prior_precision_).inverse();
        posterior_.mean = covariance * data_precision_ * data_;
        posterior_.factor = covariance.llt().matrixL();
    }

    const CoordinateGaussian& posterior() const { return posterior_; }
    const CoordinateGaussian* approximation() const override { return &posterior_; }
    double log_density_at(const double* at) const override {
        const Eigen::Map<const Eigen::VectorXd> x(at, n_coordinates());
        return log_prior_normalisation_ - 0.5 * x.dot(prior_precision_ * x) -
               0.5 * (x - data_).dot(data_precision_ * (x - data_));
    }
    double log_prior(const Eigen::VectorXd& x) const {
        return log_prior_normalisation_ - 0.5 * x.dot(prior_precision_ * x);
    }

  private:
    Eigen::VectorXd data_;
    Eigen::MatrixXd data_precision_, prior_precision_;
    double log_prior_normalisation_;
    CoordinateGaussian posterior_;
};

/// Independent draws from a Gaussian target, as a chain of 4 replicates of 10 walkers.
template <class GaussianTarget>
CoordinateDraws draws_of(const GaussianTarget& target, Eigen::Index n_rows, std::uint64_t key) {
    CoordinateDraws draws{n_rows, 4, 10, {}, {}};
    const Eigen::Index n = n_rows * 40, d = target.n_coordinates();
    draws.coordinates.resize(d, n);
    draws.log_posterior.resize(n);
    for (Eigen::Index draw = 0; draw < n; ++draw) {
        Stream stream(key, Purpose::test, 7, static_cast<std::uint64_t>(draw), 0);
        Eigen::VectorXd z(d);
        for (double& one : z) one = normal(stream);
        draws.coordinates.col(draw) = target.posterior().mean + target.posterior().factor * z;
        draws.log_posterior[draw] = target.log_density_at(draws.coordinates.col(draw).data());
    }
    return draws;
}

ConjugateTarget three_components() {
    return {Eigen::Vector3d(3e-3, -2e-3, 4e-3),
            Eigen::Vector3d(2e-6, 2e-6, 1e-6).asDiagonal(),
            25e-6 * Eigen::Matrix3d::Identity()};
}

/// Closed form: ln of the density of the data, N(0, C + prior covariance), without the
/// normalisation that the likelihood here leaves out.
double exact_evidence() {
    const Eigen::Vector3d data(3e-3, -2e-3, 4e-3), variance(2e-6, 2e-6, 1e-6);
    const Eigen::Array3d whole = variance.array() + 25e-6;
    return 0.5 * ((variance.array() / whole).log() - data.array().square() / whole).sum();
}

}  // namespace

TEST_CASE("the bridge converges to its published fixed point on given points", "[summary]") {
    // q = exp(-x^2/2), g = N(0.5, 1.5^2), 1000 points each at quantiles (i - 0.5)/1000: Meng &
    // Wong 1996 iterated with 50 digits gives 2.506719771412 (ln 0.918975034473); the exact
    // integral is sqrt(2 pi).
    const boost::math::normal first(0.0, 1.0), second(0.5, 1.5);
    std::vector<double> at_first, at_second;
    const auto log_ratio = [&](double x) {
        const double y = (x - 0.5) / 1.5;
        return -0.5 * x * x + 0.5 * y * y + std::log(1.5 * std::sqrt(2.0 * std::numbers::pi));
    };
    for (int i = 1; i <= 1000; ++i) {
        const double share = (i - 0.5) / 1000.0;
        at_first.push_back(log_ratio(boost::math::quantile(first, share)));
        at_second.push_back(log_ratio(boost::math::quantile(second, share)));
    }
    CHECK(bridge(at_first, at_second, 0.5) == Approx(0.918975034473).epsilon(0).margin(1e-11));
    SECTION("a common factor moves it by its logarithm, without limit") {
        for (double& x : at_first) x += 5000.0;
        for (double& x : at_second) x += 5000.0;
        CHECK(bridge(at_first, at_second, 0.5) ==
              Approx(5000.918975034473).epsilon(0).margin(1e-9));
    }
}

TEST_CASE("a bridge without footing has no value", "[summary]") {
    const std::vector<double> some{0.0, 1.0}, none;
    const std::vector<double> outside(3, -std::numeric_limits<double>::infinity());
    CHECK(std::isnan(bridge(none, some, 0.5)));
    CHECK(std::isnan(bridge(some, none, 0.5)));
    CHECK(std::isnan(bridge(some, outside, 0.5)));
}

TEST_CASE("evidence of a Gaussian in three dimensions", "[summary]") {
    const ConjugateTarget target = three_components();
    const double exact = exact_evidence();
    const CoordinateDraws draws = draws_of(target, 250, seed);
    const Evidence found = evidence_of(target, draws, {.seed = seed});
    CHECK(std::abs(found.bridge.value - exact) < 4.0 * found.bridge.error);
    CHECK(found.bridge.error < 0.01);
    CHECK(std::abs(found.importance.value - exact) < 4.0 * found.importance.error);
    CHECK(found.importance.error < 0.01);
    CHECK(found.importance_draws > 5000.0);
    SECTION("two threads give the same bits") {
        const Evidence again = evidence_of(target, draws, {.seed = seed, .threads = 2});
        CHECK(again.bridge.value == found.bridge.value);
        CHECK(again.bridge.error == found.bridge.error);
        CHECK(again.importance.value == found.importance.value);
    }
}

TEST_CASE("Savage-Dickey ratios of Gaussians are exact", "[summary]") {
    SECTION("one dimension") {
        // Ten data N(theta, 1) of mean 0.3, prior N(0, 2^2): BF01 = 4.12787044446 (the
        // formula of Dickey 1971).
        const ConjugateTarget target(Eigen::VectorXd::Constant(1, 0.3),
                                     Eigen::MatrixXd::Constant(1, 1, 0.1),
                                     Eigen::MatrixXd::Constant(1, 1, 4.0));
        const CoordinateDraws draws = draws_of(target, 250, seed);
        TestedPoints points{{0}, Eigen::MatrixXd::Zero(1, draws.size()), {}};
        points.log_density =
            Eigen::VectorXd::Constant(draws.size(), target.log_prior(Eigen::VectorXd::Zero(1)));
        const LogEvidence found = savage_dickey(target, draws, points, {.seed = seed});
        CHECK(std::abs(found.value - 1.417761643108) < 4.0 * found.error);
        CHECK(found.error < 0.01);
    }
    SECTION("three dimensions, four standard deviations away") {
        // ln BF01 = -6.469828997112 (same formula).
        const ConjugateTarget target = three_components();
        const CoordinateDraws draws = draws_of(target, 250, seed);
        TestedPoints points{{0, 1, 2}, Eigen::MatrixXd::Zero(3, draws.size()), {}};
        points.log_density =
            Eigen::VectorXd::Constant(draws.size(), target.log_prior(Eigen::VectorXd::Zero(3)));
        const LogEvidence found = savage_dickey(target, draws, points, {.seed = seed});
        CHECK(std::abs(found.value + 6.469828997112) < 4.0 * found.error);
        CHECK(found.error < 0.01);
    }
}

TEST_CASE("Savage-Dickey carries the other coordinates along", "[summary]") {
    // Two coordinates, correlated at 0.95; the first is tested 20 standard deviations away,
    // where a ratio taken at the draws' own second coordinate would rest on none of them.
    Eigen::Matrix2d data_covariance;
    data_covariance << 1.0, 0.95, 0.95, 1.0;
    const Eigen::Matrix2d prior_covariance = 400.0 * Eigen::Matrix2d::Identity();
    const Eigen::Vector2d data(20.0, 3.0);
    const ConjugateTarget target(data, data_covariance, prior_covariance);
    const CoordinateDraws draws = draws_of(target, 250, seed);
    TestedPoints points{{0}, Eigen::MatrixXd::Zero(1, draws.size()), {}};
    points.log_density = Eigen::VectorXd::Constant(
        draws.size(), -0.5 * std::log(2.0 * std::numbers::pi * 400.0));
    const LogEvidence found = savage_dickey(target, draws, points, {.seed = seed});
    const Eigen::Matrix2d covariance =
        target.posterior().factor * target.posterior().factor.transpose();
    const double exact =
        -0.5 * std::log(covariance(0, 0) / 400.0) -
        0.5 * target.posterior().mean[0] * target.posterior().mean[0] / covariance(0, 0);
    CHECK(std::abs(found.value - exact) < 4.0 * found.error);
    CHECK(found.error < 0.02);
    CHECK(exact < -150.0);
}

TEST_CASE("errors of the evidence are honest", "[summary]") {
    const ConjugateTarget target = three_components();
    const double exact = exact_evidence();
    double bridge_square = 0.0, importance_square = 0.0;
    constexpr int n_seeds = 50;
    for (std::uint64_t s = 0; s < n_seeds; ++s) {
        const Evidence found = evidence_of(
            target, draws_of(target, 25, seed + s), {.seed = seed + s, .proposal_draws = 1000});
        bridge_square += std::pow((found.bridge.value - exact) / found.bridge.error, 2);
        importance_square +=
            std::pow((found.importance.value - exact) / found.importance.error, 2);
    }
    // A chi-square of 50 degrees of freedom lies outside 24.6 … 86.7 twice in a thousand times.
    CHECK(bridge_square > 24.6);
    CHECK(bridge_square < 86.7);
    CHECK(importance_square > 24.6);
    CHECK(importance_square < 86.7);
}
