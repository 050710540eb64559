// SPDX-License-Identifier: GPL-2.0-or-later
#include "deviascope/summary/fit_check.h"

#include <catch2/catch.hpp>
#include <cmath>

#include "deviascope/model/expected_counts.h"
#include "kolmogorov.h"
#include "poisson_data.h"
#include "synthetic_counts.h"

using namespace deviascope;

namespace {

constexpr std::uint64_t seed = 20261202;
const VectorPrior none("none", FixedPrior{});

/// The row with the velocity and dipole given, and monopoles at their maxima.
Eigen::VectorXd row_at(const ParameterSpace& space,
                       const Eigen::Vector3d& velocity,
                       const Eigen::Vector3d& dipole) {
    Eigen::VectorXd row = Eigen::VectorXd::Zero(space.n_parameters());
    row.head<3>() = velocity;
    for (const BinTerm& term : space.terms()) {
        row.segment<3>(term.intrinsic) = dipole;
        row[term.weight] = space.options()
                               .surveys[term.survey]
                               .weights.mean[static_cast<Eigen::Index>(term.bin)];
        row[term.monopole] = NAN;
    }
    return row;
}

std::vector<FitCheck> check(const Counts& counts,
                            const ModelOptions& model,
                            const Eigen::Vector3d& velocity = Eigen::Vector3d::Zero()) {
    const ParameterSpace space(counts, model);
    const Eigen::Index n = space.n_parameters();
    return check_fit(counts,
                     space,
                     row_at(space, velocity, Eigen::Vector3d::Zero()),
                     Eigen::MatrixXd::Zero(n, n),
                     2);
}

const std::vector<synthetic::Survey> cut_sky{
    {"dunlin", {{"faint", 40000, 3.0}}, Eigen::Vector3d::Zero(), [](const Direction& n) {
         return std::abs(n.z()) > 0.3 ? 1.0 - 0.4 * n.x() : 0.0;
     }}};

}  // namespace

TEST_CASE("dispersion of counts given in closed form", "[summary]") {
    // N_i = floor(200 (1 + 0.1 a.n_i)) + (i mod 7), a = (-2, -1, 2)/3, nside 8: sum of
    // (N - mean)^2 / mean is 519.8585281163 over 767 degrees of freedom (Fisher's index of
    // dispersion, computed in quadruple precision).
    const Counts counts = poisson_data::make_counts({poisson_data::first_bin()});
    const ModelOptions model =
        synthetic::make_model({{"dunlin", {{"one", 1.0, 2.0}}}}, none, none);
    const FitCheck found = check(counts, model).front();
    CHECK(found.chi2 == Approx(519.8585281163).epsilon(1e-11));
    CHECK(found.degrees == 767.0);
    CHECK(found.dispersion == Approx(0.6777816533).epsilon(1e-9));
    CHECK(is_under_dispersed(found));
    CHECK_FALSE(is_over_dispersed(found));
}

TEST_CASE("expected counts follow the model's formula", "[summary]") {
    const Counts counts = synthetic::make_counts(8, Eigen::Vector3d::Zero(), cut_sky, seed);
    const ModelOptions model = synthetic::make_model(cut_sky, none, none);
    const ParameterSpace space(counts, model);
    const Eigen::Vector3d velocity(0.02, -0.03, 0.05), dipole(0.1, 0.2, -0.1);
    const std::vector<double> found =
        expected_counts(counts, space.terms()[0], row_at(space, velocity, dipole));
    const std::vector<double> shape = synthetic::relative_expectation(
        counts.surveys[0].footprints[0], 8, velocity, dipole, 3.0);
    double sum = 0.0;
    for (const double value : shape) sum += value;
    const auto total = static_cast<double>(counts.surveys[0].bins[0].total());
    for (std::size_t p = 0; p < found.size(); ++p)
        CHECK(found[p] == Approx(total * shape[p] / sum).epsilon(1e-12));
}

TEST_CASE("probabilities are uniform for Poisson counts, few or many a pixel", "[summary]") {
    // 400 skies; Kolmogorov-Smirnov at p > 0.001. The expectation is the truth, but for the
    // monopole.
    for (const double sources : {1500.0, 40000.0}) {
        std::vector<synthetic::Survey> surveys = cut_sky;
        surveys[0].bins[0].sources = sources;
        const ModelOptions model = synthetic::make_model(surveys, none, none);
        std::vector<double> dispersion, quadrupole, octupole, hexadecapole;
        for (std::uint64_t sky = 0; sky < 400; ++sky) {
            const Counts counts =
                synthetic::make_counts(8, Eigen::Vector3d::Zero(), surveys, seed + sky);
            const FitCheck found = check(counts, model).front();
            dispersion.push_back(found.probability);
            quadrupole.push_back(found.power[0].probability);
            octupole.push_back(found.power[1].probability);
            hexadecapole.push_back(found.power[2].probability);
        }
        for (auto* values : {&dispersion, &quadrupole, &octupole, &hexadecapole}) {
            INFO(sources);
            CHECK(kolmogorov_distance(*values, [](double x) { return x; }) < 1.949);
        }
    }
}

TEST_CASE("a dipole that the model lacks does not leak into the multipoles", "[summary]") {
    const ModelOptions model = synthetic::make_model(cut_sky, none, none);
    std::vector<synthetic::Survey> bright = cut_sky;
    bright[0].bins[0].sources = 4e6;
    const Counts counts =
        synthetic::make_counts(8, Eigen::Vector3d(0.01, -0.005, 0.004), bright, seed);
    const FitCheck found = check(counts, model).front();
    CHECK(is_over_dispersed(found));
    for (const ResidualPower& power : found.power) CHECK(power.probability > 1e-4);
}

TEST_CASE("a quadrupole in the counts is found as one", "[summary]") {
    // On the full sky, where multipoles do not mix: 10^6 sources and 0.05 x y give sum lambda
    // (0.05 x y)^2 = 10^6 0.0025 / 15 = 167.
    const std::vector<synthetic::Survey> surveys{{"dunlin", {{"faint", 1e6, 3.0}}}};
    Counts counts = synthetic::make_counts(8, Eigen::Vector3d::Zero(), surveys, seed);
    BinCounts& bin = counts.surveys[0].bins[0];
    const Footprint& footprint = counts.surveys[0].footprints[0];
    const Pixelisation grid(8);
    for (std::size_t p = 0; p < bin.count.size(); ++p) {
        const Direction n = grid.centre(footprint.pixel[p]);
        bin.count[p] = static_cast<std::uint32_t>(
            std::lround(bin.count[p] * (1.0 + 0.05 * n.x() * n.y())));
    }
    const FitCheck found = check(counts, synthetic::make_model(surveys, none, none)).front();
    CHECK(found.power[0].probability < 1e-6);
    CHECK(found.power[2].probability > 1e-4);
}

TEST_CASE("clumped counts are over-dispersed by what they were made with", "[summary]") {
    // Each source is 1 + Poisson(0.3) components: dispersion E[k^2]/E[k] = (1.69 + 0.3)/1.3.
    constexpr double expected = 1.99 / 1.3;
    std::vector<synthetic::Survey> surveys = cut_sky;
    surveys[0].bins[0].sources = 2e5;
    Counts counts = synthetic::make_counts(16, Eigen::Vector3d::Zero(), surveys, seed);
    BinCounts& bin = counts.surveys[0].bins[0];
    for (std::size_t p = 0; p < bin.count.size(); ++p) {
        Stream stream(seed, Purpose::test, 9, p, 0);
        const double mean = 0.3 * bin.count[p];
        if (mean > 0.0) bin.count[p] += synthetic::draw_poisson(stream, mean);
    }
    const FitCheck found = check(counts, synthetic::make_model(surveys, none, none)).front();
    CHECK(is_over_dispersed(found));
    CHECK(std::abs(found.dispersion - expected) < 4.0 * found.dispersion_sd);
    CHECK(found.dispersion_sd ==
          Approx(expected * std::sqrt(2.0 / found.degrees)).epsilon(0.1));
    SECTION("a dispersion that says so mends it") {
        surveys[0].bins[0].dispersion = found.dispersion;
        const FitCheck mended =
            check(counts, synthetic::make_model(surveys, none, none)).front();
        CHECK(mended.dispersion == found.dispersion);
        CHECK(mended.probability > 0.05);
        CHECK(mended.probability < 0.95);
    }
}

TEST_CASE("the furthest pixels come first, with their signs", "[summary]") {
    Counts counts = synthetic::make_counts(8, Eigen::Vector3d::Zero(), cut_sky, seed);
    BinCounts& bin = counts.surveys[0].bins[0];
    bin.count[100] += 100;
    bin.count[200] = 0;
    const FitCheck found = check(counts, synthetic::make_model(cut_sky, none, none)).front();
    REQUIRE(found.largest.size() == 5);
    const Footprint& footprint = counts.surveys[0].footprints[0];
    const auto place = [&](std::size_t p) { return footprint.pixel[p]; };
    CHECK(std::abs(found.largest[0].sigma) >= std::abs(found.largest[1].sigma));
    for (const ResidualPixel& pixel : {found.largest[0], found.largest[1]}) {
        CHECK((pixel.pixel == place(100) || pixel.pixel == place(200)));
        CHECK((pixel.pixel == place(100) ? pixel.sigma > 5.0 : pixel.sigma < -5.0));
    }
}

TEST_CASE("a multipole that the sky cannot hold has no level", "[summary]") {
    // Eight pixels hold 4 + 4 functions: a quadrupole of five cannot stand beside the dipole.
    Counts counts;
    counts.nside = 8;
    SurveyCounts survey;
    survey.name = "dunlin";
    survey.footprints.push_back({{0, 1, 2, 3, 4, 5, 6, 7}, std::vector<double>(8, 1.0)});
    survey.bins.push_back({"one", 0, {9, 11, 10, 12, 8, 10, 9, 11}});
    counts.surveys.push_back(survey);
    const FitCheck found =
        check(counts, synthetic::make_model({{"dunlin", {{"one", 1.0, 2.0}}}}, none, none))
            .front();
    CHECK(std::isnan(found.power[0].probability));
    CHECK(std::isnan(found.power[2].chi2));
}
