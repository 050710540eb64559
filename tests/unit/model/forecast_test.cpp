// SPDX-License-Identifier: GPL-2.0-or-later
#include "deviascope/model/forecast.h"

#include <catch2/catch.hpp>
#include <cmath>
#include <limits>

using namespace deviascope;

namespace {

constexpr double per_pixel = 10.0;
constexpr int nside = 8;
constexpr double n_sources = per_pixel * 12 * nside * nside;

/// A survey with the same count in every pixel of the full sky, in bins of these weights.
struct EvenSky {
    Counts counts;
    ModelOptions model;

    explicit EvenSky(const std::vector<double>& weights) {
        counts.nside = nside;
        SurveyCounts survey;
        survey.name = "dunlin";
        Footprint all;
        for (std::int64_t pixel = 0; pixel < 12 * nside * nside; ++pixel) {
            all.pixel.push_back(pixel);
            all.exposure.push_back(1.0);
        }
        SurveyModel fitted;
        fitted.weights.mean = Eigen::VectorXd::Zero(std::ssize(weights));
        fitted.weights.covariance =
            Eigen::MatrixXd::Zero(std::ssize(weights), std::ssize(weights));
        for (std::size_t bin = 0; bin < weights.size(); ++bin) {
            survey.bins.push_back({"b" + std::to_string(bin),
                                   0,
                                   std::vector<std::uint32_t>(all.pixel.size(), 10)});
            fitted.weights.mean[static_cast<Eigen::Index>(bin)] = weights[bin];
            fitted.bins.emplace_back();
        }
        survey.footprints.push_back(all);
        counts.surveys.push_back(survey);
        model.surveys.push_back(fitted);
    }
    std::vector<VectorForecast> forecast() const {
        return deviascope::forecast(counts, ParameterSpace(counts, model));
    }
};

VectorPrior gaussian(double sd) {
    return {"given",
            GaussianPrior{Eigen::Vector3d::Zero(), sd * sd * Eigen::Matrix3d::Identity()}};
}

constexpr double infinity = std::numeric_limits<double>::infinity();

}  // namespace

// The mean of n n^T over the sphere is 1/3: N counts on the full sky hold the information
// N B^2 / 3 on a component of the velocity, N / 3 on one of the intrinsic dipole, and N B / 3
// between the two.

TEST_CASE("the velocity alone is expected to sqrt(3/N)/B a component", "[model]") {
    EvenSky sky({3.5});
    sky.model.velocity = gaussian(0.02);
    const auto forecast = sky.forecast();
    REQUIRE(forecast.size() == 2);
    const double expected = std::sqrt(3.0 / n_sources) / 3.5;
    CHECK(forecast[0].name == "velocity");
    CHECK(forecast[0].n_free == 3);
    CHECK(forecast[0].counts_sd == Approx(expected).epsilon(1e-6));
    CHECK(forecast[0].prior_sd == Approx(0.02).epsilon(1e-12));
    CHECK(forecast[0].expected_sd ==
          Approx(1.0 / std::hypot(1.0 / expected, 1.0 / 0.02)).epsilon(1e-6));
    CHECK_FALSE(forecast[0].prior_rules);
    CHECK(forecast[1].n_free == 0);
    CHECK_FALSE(forecast[1].prior_rules);
}

TEST_CASE("two vectors are expected as far apart as the weights of the bins", "[model]") {
    EvenSky sky({2.0, 6.0});
    sky.model.velocity = VectorPrior("free", UniformVectorPrior{0.9});
    sky.model.surveys[0].intrinsic = gaussian(1e6);  // flat
    const auto forecast = sky.forecast();
    // sum N_b (B_b - B)^2 / 3 is left when a flat intrinsic dipole is eliminated.
    CHECK(forecast[0].counts_sd ==
          Approx(std::sqrt(3.0 / (n_sources * (4.0 + 4.0)))).epsilon(1e-4));
    CHECK(forecast[0].prior_sd == Approx(0.9 / std::sqrt(5.0)).epsilon(1e-12));
}

TEST_CASE("equal weights leave the split to the priors, and a narrow prior rules", "[model]") {
    EvenSky sky({4.0, 4.0});
    const double n = 2.0 * n_sources;
    sky.model.velocity = gaussian(1e-4);
    sky.model.surveys[0].intrinsic = gaussian(0.1);
    auto forecast = sky.forecast();
    const double information = n * 16.0 / 3.0 - std::pow(n * 4.0 / 3.0, 2) / (n / 3.0 + 1e2);
    CHECK(forecast[0].counts_sd == Approx(1.0 / std::sqrt(information)).epsilon(1e-5));
    CHECK(forecast[0].prior_rules);
    CHECK_FALSE(forecast[1].prior_rules);
    sky.model.surveys[0].intrinsic = gaussian(1e9);
    forecast = sky.forecast();
    CHECK(forecast[0].counts_sd == infinity);
    CHECK(forecast[0].expected_sd == Approx(1e-4).epsilon(1e-6));
    // A measurement is meant to rule.
    sky.model.velocity = VectorPrior(
        "measured",
        GaussianPrior{Eigen::Vector3d(0.001, 0, 0), 1e-8 * Eigen::Matrix3d::Identity()});
    CHECK_FALSE(sky.forecast()[0].prior_rules);
}

TEST_CASE("a vector along an axis has one component", "[model]") {
    EvenSky sky({3.0});
    sky.model.velocity = VectorPrior("axis", AxisPrior{Direction::UnitY(), 0.5});
    const auto forecast = sky.forecast();
    CHECK(forecast[0].n_free == 1);
    // (On pixel centres the mean of n_y^2 alone is 1/3 to 1e-3 only.)
    CHECK(forecast[0].counts_sd == Approx(std::sqrt(3.0 / n_sources) / 3.0).epsilon(1e-3));
    CHECK(forecast[0].prior_sd == Approx(0.5 / std::sqrt(12.0)).epsilon(1e-12));
    sky.model.monopole.sampled = true;
    CHECK(sky.forecast()[0].counts_sd == Approx(forecast[0].counts_sd).epsilon(1e-9));
}
