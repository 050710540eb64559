// SPDX-License-Identifier: GPL-2.0-or-later
#include <catch2/catch.hpp>
#include <cmath>
#include <functional>

#include "deviascope/model/posterior.h"
#include "exact_posterior.h"
#include "synthetic_counts.h"

using namespace deviascope;

namespace {

double cap(const Direction& n) {
    return n.z() > -0.35 && n.x() < 0.9 ? 1.0 - 0.4 * n.y() * n.y() : 0.0;
}

std::vector<synthetic::Survey> two_surveys() {
    return {{"dunlin",
             {{"faint", 9000, 2.5}, {"bright", 4000, 6.0, 0.0, 1.3, 1.5}},
             {0.1, -0.2, 0.1},
             cap},
            {"lantern", {{"one", 6000, 9.0}}}};
}

/// The same sky turned or mirrored by a matrix that maps pixel centres onto pixel centres.
Counts moved(const Counts& counts, const Eigen::Matrix3d& matrix) {
    const Pixelisation grid(counts.nside);
    Counts result = counts;
    for (std::size_t s = 0; s < counts.surveys.size(); ++s) {
        const SurveyCounts& from = counts.surveys[s];
        const Footprint& footprint = from.footprints[0];
        std::vector<std::size_t> source(static_cast<std::size_t>(grid.n_pixels()),
                                        footprint.pixel.size());
        for (std::size_t p = 0; p < footprint.pixel.size(); ++p) {
            const Direction image = matrix * grid.centre(footprint.pixel[p]);
            const std::int64_t pixel = grid.pixel_at(image);
            REQUIRE((grid.centre(pixel) - image).norm() < 1e-14);
            source[static_cast<std::size_t>(pixel)] = p;
        }
        SurveyCounts& to = result.surveys[s];
        to.footprints[0] = {};
        for (BinCounts& bin : to.bins) bin.count.clear();
        for (std::size_t pixel = 0; pixel < source.size(); ++pixel) {
            if (source[pixel] == footprint.pixel.size()) continue;
            to.footprints[0].pixel.push_back(static_cast<std::int64_t>(pixel));
            to.footprints[0].exposure.push_back(footprint.exposure[source[pixel]]);
            for (std::size_t b = 0; b < to.bins.size(); ++b)
                to.bins[b].count.push_back(from.bins[b].count[source[pixel]]);
        }
    }
    return result;
}

Eigen::VectorXd densities(const Posterior& target, const Eigen::MatrixXd& walkers) {
    Eigen::VectorXd posterior(walkers.cols()), likelihood(walkers.cols());
    target.log_density(walkers, posterior, likelihood);
    return likelihood;
}

/// Vectors of every size up to `furthest`, three of them a column.
Eigen::MatrixXd random_vectors(Eigen::Index n, double furthest, std::uint64_t seed) {
    const VectorPrior prior("any", UniformAmplitudePrior{furthest});
    Eigen::MatrixXd vectors(9, n);
    for (Eigen::Index w = 0; w < n; ++w) {
        Stream stream(seed, Purpose::test, 1, static_cast<std::uint64_t>(w), 0);
        for (Eigen::Index v = 0; v < 9; v += 3) {
            const double shrink = std::pow(10.0, -4.0 * uniform(stream));
            vectors.col(w).segment<3>(v) = shrink * prior.draw(stream);
        }
    }
    return vectors;
}

ModelOptions wide_model() {
    ModelOptions model = synthetic::make_model(
        two_surveys(), {"wide", UniformVectorPrior{1.0}}, {"wide", UniformVectorPrior{1.0}});
    model.engine.engine = Engine::pixel;
    return model;
}

}  // namespace

TEST_CASE("the likelihood turns and mirrors with map and vectors", "[model]") {
    // Exact symmetries of the HEALPix grid: quarter turns about the pole, the mirror images in
    // longitude and in latitude, and inversion (amplitude and direction flip together).
    const Counts counts = synthetic::make_counts(8, {0.01, 0.02, -0.03}, two_surveys(), 91);
    const Eigen::MatrixXd vectors = random_vectors(40, 0.7, 92);
    const Eigen::VectorXd here = densities(Posterior(counts, wide_model()), vectors);
    Eigen::Matrix3d quarter_turn;
    quarter_turn << 0, -1, 0, 1, 0, 0, 0, 0, 1;
    const std::vector<Eigen::Matrix3d> symmetries = {quarter_turn,
                                                     quarter_turn * quarter_turn,
                                                     Eigen::Vector3d(1, -1, 1).asDiagonal(),
                                                     Eigen::Vector3d(1, 1, -1).asDiagonal(),
                                                     Eigen::Vector3d(-1, -1, -1).asDiagonal()};
    for (const Eigen::Matrix3d& symmetry : symmetries) {
        Eigen::MatrixXd there = vectors;
        for (Eigen::Index v = 0; v < 9; v += 3)
            there.middleRows(v, 3) = symmetry * vectors.middleRows(v, 3);
        const Eigen::VectorXd found =
            densities(Posterior(moved(counts, symmetry), wide_model()), there);
        REQUIRE(here.allFinite());
        for (Eigen::Index w = 0; w < here.size(); ++w)
            CHECK(std::abs(found[w] - here[w]) < 1e-9 + 1e-13 * std::abs(here[w]));
    }
}

TEST_CASE("the pixel engine holds its accuracy at 10^9 sources", "[model]") {
    // Truth: 80-bit sums. Differences between points are what a sampler sees.
    std::vector<synthetic::Survey> surveys = two_surveys();
    for (synthetic::Survey& survey : surveys)
        for (synthetic::Bin& bin : survey.bins) bin.sources = 1e9 / 3.0;
    const Counts counts = synthetic::make_counts(16, {0.001, 0.0, -0.001}, surveys, 93);
    const Posterior target(counts, wide_model());
    for (const double furthest : {0.003, 0.03, 0.7}) {
        const Eigen::MatrixXd vectors = random_vectors(12, furthest, 94);
        const Eigen::VectorXd found = densities(target, vectors);
        Eigen::MatrixXd rows(target.space().n_parameters(), vectors.cols());
        target.to_parameters(vectors, rows);
        for (Eigen::Index w = 0; w < vectors.cols(); ++w) {
            const auto truth = exact::log_likelihood(counts, target.space(), rows.col(w));
            INFO("furthest " << furthest << " value " << found[w]);
            CHECK(std::abs(static_cast<double>(found[w] - truth)) <
                  1e-7 + 1e-15 * std::abs(found[w]));
        }
    }
}

TEST_CASE("bins with footprints of their own are summed as if they stood alone", "[model]") {
    // Two bins of a survey with unlike exposures and kept pixels, against two surveys that hold
    // one of them each and share their intrinsic vector.
    const std::vector<synthetic::Survey> apart = {
        {"dunlin", {{"faint", 9000, 2.5}}, {0, 0, 0}, cap},
        {"lantern", {{"bright", 4000, 6.0}}, {0, 0, 0}}};
    const Counts two = synthetic::make_counts(8, {0.01, 0, 0}, apart, 95);
    Counts one = two;
    one.surveys.resize(1);
    one.surveys[0].footprints.push_back(two.surveys[1].footprints[0]);
    one.surveys[0].bins.push_back(two.surveys[1].bins[0]);
    one.surveys[0].bins[1].footprint = 1;
    const VectorPrior wide("wide", UniformVectorPrior{1.0});
    ModelOptions shared = synthetic::make_model(apart, wide, wide);
    shared.intrinsic_shared = true;
    const ModelOptions joined = synthetic::make_model(
        {{"dunlin", {{"faint", 9000, 2.5}, {"bright", 4000, 6.0}}}}, wide, wide);
    const Eigen::MatrixXd vectors = random_vectors(20, 0.9, 96).topRows(6);
    const Eigen::VectorXd a = densities(Posterior(two, shared), vectors);
    const Eigen::VectorXd b = densities(Posterior(one, joined), vectors);
    CHECK((a.array() == b.array()).all());
    CHECK(a.allFinite());
}
