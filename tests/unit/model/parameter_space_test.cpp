// SPDX-License-Identifier: GPL-2.0-or-later
#include "deviascope/model/parameter_space.h"

#include <catch2/catch.hpp>
#include <cmath>
#include <numbers>

#include "deviascope/core/error.h"
#include "synthetic_counts.h"

using namespace deviascope;

namespace {

std::vector<synthetic::Survey> two_surveys() {
    return {{"dunlin", {{"faint", 300, 3.5, 0.1}, {"bright", 200, 4.0, 0.0}}},
            {"lantern", {{"all-sky", 100, 2.5, 0.2, 1.5}}}};
}

struct Case {
    std::vector<synthetic::Survey> surveys = two_surveys();
    Counts counts = synthetic::make_counts(1, {0, 0, 0}, surveys, 51);
    ModelOptions options = synthetic::make_model(
        surveys, {"free", UniformAmplitudePrior{0.1}}, {"modest", UniformVectorPrior{0.2}});
};

std::vector<std::string> names_of(const ParameterSpace& space) {
    std::vector<std::string> names;
    for (const Parameter& parameter : space.parameters()) names.push_back(parameter.name);
    return names;
}

}  // namespace

TEST_CASE("parameters stand in the order of the chain, with names, units, roles", "[model]") {
    Case job;
    job.options.surveys[1].intrinsic = VectorPrior("axis", AxisPrior{Direction::UnitY(), 0.1});
    const ParameterSpace space(job.counts, job.options);
    CHECK(names_of(space) == std::vector<std::string>{"velocity.x",
                                                      "velocity.y",
                                                      "velocity.z",
                                                      "intrinsic.dunlin.x",
                                                      "intrinsic.dunlin.y",
                                                      "intrinsic.dunlin.z",
                                                      "intrinsic.lantern.x",
                                                      "intrinsic.lantern.y",
                                                      "intrinsic.lantern.z",
                                                      "weight.dunlin.faint",
                                                      "weight.dunlin.bright",
                                                      "weight.lantern.all-sky",
                                                      "monopole.dunlin.faint",
                                                      "monopole.dunlin.bright",
                                                      "monopole.lantern.all-sky"});
    const std::vector<Parameter>& p = space.parameters();
    CHECK(p[0].unit == "c");
    CHECK(p[3].unit == "1");
    CHECK(p[14].unit == "1/sr");
    for (const Parameter& parameter : p) CHECK_FALSE(parameter.meaning.empty());
    CHECK(p[0].meaning.find("galactic") != std::string::npos);
    CHECK(p[6].role == Role::constant);  // the axis has no x component
    CHECK(p[7].role == Role::sampled);
    CHECK(p[9].role == Role::sampled);
    CHECK(p[10].role == Role::constant);
    CHECK(p[12].role == Role::redrawn);
    CHECK(space.n_coordinates() == 3 + 3 + 1 + 2);
    CHECK(space.vectors().size() == 3);
    CHECK(space.vectors()[2].first == 6);
    CHECK(space.vectors()[2].amplitude_free);
    CHECK_FALSE(space.vectors()[2].direction_free);
    CHECK(space.terms()[2].intrinsic == 6);
    CHECK(space.terms()[2].weight == 11);
    CHECK(space.terms()[2].monopole == 14);
    CHECK(space.terms()[2].bias_ratio == 1.5);
}

TEST_CASE("a shared intrinsic vector and sampled monopoles have their places", "[model]") {
    Case job;
    job.options.intrinsic_shared = true;
    job.options.velocity = VectorPrior("still", FixedPrior{{0.0, 0.0, 0.001}});
    job.options.monopole.sampled = true;
    const ParameterSpace space(job.counts, job.options);
    CHECK(space.parameters()[3].name == "intrinsic.all.x");
    CHECK(space.parameters()[2].role == Role::constant);
    CHECK(space.parameters()[9].role == Role::sampled);
    CHECK(space.vectors().size() == 2);
    CHECK_FALSE(space.vectors()[0].amplitude_free);
    CHECK(space.n_coordinates() == 3 + 2 + 3);
    CHECK(space.terms()[0].intrinsic == 3);
    CHECK(space.terms()[2].intrinsic == 3);
}

TEST_CASE("coordinates and parameters turn into each other", "[model]") {
    Case job;
    job.options.monopole.sampled = true;
    const ParameterSpace space(job.counts, job.options);
    Eigen::VectorXd coordinates(space.n_coordinates());
    coordinates << 0.05, -0.02, 0.03, 0.01, 0.02, -0.1, 0.05, 0.06, 0.07, 3.4, 2.6, 5.0, 4.0,
        3.0;
    Eigen::VectorXd row(space.n_parameters());
    space.to_parameters(coordinates, row);
    CHECK(row.head<3>().norm() ==
          Approx(std::pow(coordinates.head<3>().norm(), 3) / 0.01).epsilon(1e-13));
    CHECK(row[9] == 3.4);
    CHECK(row[10] == 4.0);  // not sampled: its mean
    CHECK(row[12] == Approx(std::exp(5.0)));
    CHECK((space.to_coordinates(row) - coordinates).cwiseAbs().maxCoeff() < 1e-13);
    job.options.monopole.sampled = false;
    const ParameterSpace integrated(job.counts, job.options);
    integrated.to_parameters(coordinates.head(integrated.n_coordinates()), row);
    CHECK(row.tail(3).array().isNaN().all());
}

TEST_CASE("the log prior is the sum of its parts", "[model]") {
    Case job;
    job.options.surveys[0].weights.covariance << 0.04, 0.03, 0.03, 0.09;
    job.options.monopole = {2.0, 0.5, true};
    const ParameterSpace space(job.counts, job.options);
    Eigen::VectorXd at(space.n_coordinates());
    at << 0.01, 0.0, 0.0, 0.0, 0.1, 0.0, 0.0, 0.0, 0.1, 3.6, 4.2, 2.4, 0.0, 0.5, 1.0;
    const double pi = std::numbers::pi;
    const double velocity = -std::log(4.0 / 3.0 * pi * 1e-3);
    const double intrinsic = -2.0 * std::log(4.0 / 3.0 * pi * 8e-3);
    // Bivariate normal: determinant 0.0027, quadratic form of (0.1, 0.2) by hand.
    const double pair = -std::log(2.0 * pi) - 0.5 * std::log(0.0027) -
                        0.5 * (0.09 * 0.01 - 2.0 * 0.03 * 0.02 + 0.04 * 0.04) / 0.0027;
    const double single = -0.5 * std::log(2.0 * pi * 0.04) - 0.5 * 0.01 / 0.04;
    double monopoles = 0.0;  // Gamma(2, 0.5) density of M, times M for ln M
    for (const double u : {0.0, 0.5, 1.0})
        monopoles += std::log(0.25 * std::exp(u) * std::exp(-0.5 * std::exp(u))) + u;
    CHECK(space.log_prior(at) ==
          Approx(velocity + intrinsic + pair + single + monopoles).epsilon(1e-12));
    at[4] = 0.2;
    CHECK(space.log_prior(at) == -std::numeric_limits<double>::infinity());
}

TEST_CASE("the walls are at |beta| = 1 and |r D| = 1", "[model]") {
    Case job;
    const ParameterSpace space(job.counts, job.options);
    Eigen::VectorXd row = Eigen::VectorXd::Zero(space.n_parameters());
    CHECK(space.is_inside_walls(row));
    row[8] = 0.66;  // lantern, r = 1.5
    CHECK(space.is_inside_walls(row));
    row[8] = 0.67;
    CHECK_FALSE(space.is_inside_walls(row));
    row[8] = 0.0;
    row[5] = 0.99;
    CHECK(space.is_inside_walls(row));
    row[0] = -1.0;
    CHECK_FALSE(space.is_inside_walls(row));
}

TEST_CASE("options that do not fit the counts are refused with every fault", "[model]") {
    Case job;
    job.options.monopole.rate = -1.0;
    job.options.surveys[0].bins[0].dispersion = 0.0;
    job.options.surveys[0].weights.covariance << 0.04, 0.06, 0.06, 0.09;  // singular
    job.options.surveys[1].bins.clear();
    CHECK_THROWS_WITH(ParameterSpace(job.counts, job.options),
                      Catch::Contains("rate = -1") && Catch::Contains("dispersion = 0") &&
                          Catch::Contains("not positive definite") &&
                          Catch::Contains("lantern: 0 bins"));
    Case fixed;
    fixed.options.surveys[1].intrinsic = VectorPrior("far", FixedPrior{{0.7, 0.0, 0.0}});
    CHECK_THROWS_AS(ParameterSpace(fixed.counts, fixed.options), UsageError);
    Case covariance;
    covariance.options.surveys[0].weights.covariance << 0.04, 0.01, 0.01, 0.0;
    CHECK_THROWS_WITH(ParameterSpace(covariance.counts, covariance.options),
                      Catch::Contains("variance 0"));
}
