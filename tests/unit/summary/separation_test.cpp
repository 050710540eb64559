// SPDX-License-Identifier: GPL-2.0-or-later
#include "deviascope/summary/separation.h"

#include <Eigen/LU>
#include <algorithm>
#include <catch2/catch.hpp>
#include <cmath>

#include "deviascope/core/error.h"
#include "deviascope/model/information.h"
#include "even_counts.h"

// For one survey on the whole sky, per component and about zero vectors (derived from the
// Fisher matrix of Poisson counts): information on the velocity N sigma_K^2 / 3 with its own
// intrinsic dipole eliminated, N <K^2> / 3 with it known; N sources, Kbar and sigma_K^2 the
// mean and variance of the weights over the sources. Surveys with dipoles of their own add.

using namespace deviascope;

namespace {

constexpr int nside = 32;
// Pixel centres have <x^2> = 1/3 only to 6e-5 at this nside.
constexpr double pixel_error = 2e-4;

const std::string separated = "separated by the bins";
const std::string partly = "partly separated: priors matter";
const std::string not_separated =
    "not separated: the split between velocity and intrinsic dipole is set by the priors";

/// Weights and relative numbers of the worked example: sigma_K^2 = 1.2225.
const even::Survey four_bins{
    "dunlin", {{"a", 324, 2.5}, {"b", 243, 3.5}, {"c", 162, 4.5}, {"d", 81, 6.0}}};
const even::Survey two_bins{"lantern", {{"a", 405, 2.2}, {"b", 405, 3.0}}};

const VectorPrior free_velocity("free-velocity", UniformVectorPrior{0.05});
VectorPrior gaussian(double sd) {
    return {"gaussian",
            GaussianPrior{Eigen::Vector3d::Zero(), sd * sd * Eigen::Matrix3d::Identity()}};
}

/// Posterior means: zero vectors, weights and monopoles as given.
Eigen::VectorXd mean_of(const Counts& counts, const ParameterSpace& space) {
    Eigen::VectorXd mean = Eigen::VectorXd::Zero(space.n_parameters());
    for (const BinTerm& term : space.terms()) {
        const SurveyCounts& survey = counts.surveys[term.survey];
        const auto bin = static_cast<Eigen::Index>(term.bin);
        mean[term.weight] = space.options().surveys[term.survey].weights.mean[bin];
        mean[term.monopole] =
            static_cast<double>(survey.bins[term.bin].total()) /
            survey.footprints[0].exposed_solid_angle(Pixelisation(counts.nside));
    }
    return mean;
}

struct Case {
    Counts counts;
    ParameterSpace space;
    Separation result;
    double n_sources = 0.0;

    Case(const std::vector<even::Survey>& surveys,
         ModelOptions options,
         const Eigen::MatrixXd& covariance)
        : counts(even::counts_of(nside, surveys)), space(counts, options) {
        result = separation_of(counts, space, mean_of(counts, space), covariance);
        for (const auto& bin : counts.surveys[0].bins)
            n_sources += static_cast<double>(bin.total());
    }
};

Eigen::Matrix3d isotropic(double sd) {
    return sd * sd * Eigen::Matrix3d::Identity();
}

}  // namespace

TEST_CASE("one survey against the closed form of the separation", "[summary]") {
    const double intrinsic_sd = 0.003;
    const auto options = even::make_model({four_bins}, free_velocity, gaussian(intrinsic_sd));
    const double n = 810.0 * 12.0 * nside * nside;
    // Printed for 10^7 sources (worked out from the formula): 4.9537740462e-04.
    const double sigma = std::sqrt(3.0 / (n * 1.2225));
    CHECK(sigma * std::sqrt(n / 1e7) == Approx(4.9537740462e-04).epsilon(1e-10));

    // A posterior with exactly that covariance comes from the counts alone.
    const Case exact({four_bins}, options, isotropic(sigma));
    CHECK(exact.n_sources == n);
    CHECK(*exact.result.joint.velocity_prior_share == Approx(0.0).margin(pixel_error));
    CHECK(exact.result.joint.verdict == separated);
    CHECK(*exact.result.surveys[0].weight_spread == Approx(std::sqrt(1.2225)).epsilon(1e-12));

    // One half as wide in variance: half of it comes from elsewhere.
    const Case half({four_bins}, options, isotropic(sigma / std::sqrt(2.0)));
    CHECK(*half.result.joint.velocity_prior_share == Approx(0.5).margin(pixel_error));

    // The survey alone: intrinsic prior of variance s^2 and velocity prior max^2 / 5.
    const double known = n / 3.0 * (3.55 * 3.55 + 1.2225), cross = n / 3.0 * 3.55;
    const double with_prior =
        known - cross * cross / (n / 3.0 + 1.0 / (intrinsic_sd * intrinsic_sd));
    const double expected = 1.0 - n * 1.2225 / 3.0 / (with_prior + 5.0 / (0.05 * 0.05));
    CHECK(*exact.result.surveys[0].velocity_prior_share ==
          Approx(expected).margin(pixel_error));
    CHECK(exact.result.surveys[0].verdict == partly);
}

TEST_CASE("a second survey adds its own information", "[summary]") {
    const auto options = even::make_model({four_bins, two_bins}, free_velocity, gaussian(0.01));
    // Printed for 10^7 sources in each (same formula): 4.6583064700e-04.
    const double n = 810.0 * 12.0 * nside * nside;
    const double sigma = 4.6583064700e-04 * std::sqrt(1e7 / n);
    const Case both({four_bins, two_bins}, options, isotropic(sigma / std::sqrt(2.0)));
    CHECK(*both.result.joint.velocity_prior_share == Approx(0.5).margin(pixel_error));
    CHECK(both.result.surveys.size() == 2);
    CHECK(*both.result.surveys[1].weight_spread == Approx(0.4).epsilon(1e-12));
}

TEST_CASE("a shared intrinsic dipole is eliminated once", "[summary]") {
    auto options = even::make_model({four_bins, two_bins}, free_velocity, gaussian(0.01));
    options.intrinsic_shared = true;
    // Both surveys as one: N <K> and N <K^2> add; Kbar = (3.55 + 2.6) / 2.
    const double n = 2.0 * 810.0 * 12.0 * nside * nside;
    const double mean_square = (3.55 * 3.55 + 1.2225 + 2.6 * 2.6 + 0.16) / 2.0;
    const double spread_squared = mean_square - 3.075 * 3.075;
    const double sigma = std::sqrt(3.0 / (n * spread_squared));
    const Case shared({four_bins, two_bins}, options, isotropic(sigma / std::sqrt(2.0)));
    CHECK(*shared.result.joint.velocity_prior_share == Approx(0.5).margin(pixel_error));
}

TEST_CASE("bins of equal weight separate nothing", "[summary]") {
    const even::Survey equal{"dunlin", {{"faint", 400, 4.16}, {"bright", 200, 4.16}}};
    const auto options = even::make_model({equal}, free_velocity, gaussian(0.01));
    // The intrinsic prior narrows the velocity to 0.01 / 4.16 although the counts cannot tell.
    const Case degenerate({equal}, options, isotropic(0.01 / 4.16));
    CHECK(*degenerate.result.surveys[0].weight_spread == 0.0);
    CHECK(*degenerate.result.joint.velocity_prior_share == Approx(1.0).margin(1e-9));
    CHECK(*degenerate.result.surveys[0].velocity_prior_share == Approx(1.0).margin(1e-9));
    CHECK(degenerate.result.joint.verdict == not_separated);
    CHECK(degenerate.result.surveys[0].verdict == not_separated);
}

TEST_CASE("without an intrinsic dipole the bins determine the velocity", "[summary]") {
    const VectorPrior none("no-intrinsic", FixedPrior{});
    const double n = 810.0 * 12.0 * nside * nside;
    const double sigma = std::sqrt(3.0 / (n * (3.55 * 3.55 + 1.2225)));
    CHECK(sigma * std::sqrt(n / 1e7) == Approx(1.4730858484e-04).epsilon(1e-10));
    const Case known({four_bins},
                     even::make_model({four_bins}, free_velocity, none),
                     isotropic(sigma / std::sqrt(2.0)));
    CHECK(*known.result.joint.velocity_prior_share == Approx(0.5).margin(pixel_error));
    CHECK(known.result.surveys[0].verdict == separated);
}

TEST_CASE("a velocity along an axis has one free coordinate, a fixed one none", "[summary]") {
    const VectorPrior along("along", AxisPrior{direction_of(30.0, 40.0), 0.05});
    const double n = 810.0 * 12.0 * nside * nside;
    const double variance = 3.0 / (n * 1.2225);
    const Case axis({four_bins},
                    even::make_model({four_bins}, along, gaussian(0.01)),
                    Eigen::MatrixXd::Constant(1, 1, 0.5 * variance));
    CHECK(*axis.result.joint.velocity_prior_share == Approx(0.5).margin(pixel_error));
    CHECK(free_velocity_coordinates(axis.space).isApprox(direction_of(30.0, 40.0)));

    const VectorPrior fixed("no-motion", FixedPrior{});
    const Case none({four_bins},
                    even::make_model({four_bins}, fixed, gaussian(0.01)),
                    Eigen::MatrixXd(0, 0));
    CHECK_FALSE(none.result.joint.velocity_prior_share);
    CHECK_FALSE(none.result.surveys[0].velocity_prior_share);
    CHECK(none.result.surveys[0].weight_spread);

    CHECK_THROWS_AS(
        Case({four_bins}, even::make_model({four_bins}, along, gaussian(0.01)), isotropic(1.0)),
        InternalError);
}

TEST_CASE("a dispersion takes its part of the information", "[summary]") {
    even::Survey scattered = four_bins;
    for (even::Bin& bin : scattered.bins) bin.dispersion = 2.0;
    const double n = 810.0 * 12.0 * nside * nside;
    const Case doubled({scattered},
                       even::make_model({scattered}, free_velocity, gaussian(0.01)),
                       isotropic(std::sqrt(3.0 / (n * 1.2225))));
    CHECK(*doubled.result.joint.velocity_prior_share == Approx(0.5).margin(pixel_error));
}

TEST_CASE("uncertain weights against the inverse of the whole matrix", "[summary]") {
    even::Survey survey = four_bins;
    survey.bins[1].weight_sd = 0.3;
    survey.bins[3].weight_sd = 0.6;
    survey.bins[2].bias_ratio = 1.4;
    auto options = even::make_model({survey}, free_velocity, gaussian(0.004));
    options.surveys[0].weights.covariance(1, 3) = 0.05;
    options.surveys[0].weights.covariance(3, 1) = 0.05;
    const Counts counts = even::counts_of(8, {survey});
    const ParameterSpace space(counts, options);
    Eigen::VectorXd mean = mean_of(counts, space);
    mean.head<6>() << 0.1, -0.05, 0.2, 0.01, 0.02, -0.015;
    const Eigen::Matrix3d covariance = isotropic(0.004);
    const Separation result = separation_of(counts, space, mean, covariance);

    // velocity 0-2, intrinsic 3-5, weights 6-9, monopoles 10-13; constants taken out.
    const std::vector<Eigen::Index> sampled{0, 1, 2, 3, 4, 5, 7, 9, 10, 11, 12, 13};
    Eigen::MatrixXd whole = expected_information(counts, space, mean)(sampled, sampled);
    Eigen::Matrix2d weight_covariance;
    weight_covariance << 0.09, 0.05, 0.05, 0.36;
    whole.block<2, 2>(6, 6) += weight_covariance.inverse();
    const auto velocity_of = [](const Eigen::MatrixXd& information) {
        const Eigen::MatrixXd inverse = information.fullPivLu().inverse();
        return Eigen::Matrix3d(inverse.topLeftCorner<3, 3>().inverse());
    };
    const Eigen::Matrix3d flat = velocity_of(whole);
    CHECK(*result.joint.velocity_prior_share ==
          Approx(std::clamp(1.0 - (flat * covariance).trace() / 3.0, 0.0, 1.0)).margin(1e-7));
    whole.block<3, 3>(3, 3) += Eigen::Matrix3d::Identity() / (0.004 * 0.004);
    const Eigen::Matrix3d alone =
        (velocity_of(whole) + Eigen::Matrix3d::Identity() * 5.0 / (0.05 * 0.05)).inverse();
    CHECK(*result.surveys[0].velocity_prior_share ==
          Approx(1.0 - (flat * alone).trace() / 3.0).margin(1e-7));
}
