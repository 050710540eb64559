// SPDX-License-Identifier: GPL-2.0-or-later
// Evidence against brute force, levels under the null, and what dispersion does to errors.
#include <Eigen/Cholesky>
#include <catch2/catch.hpp>
#include <cmath>
#include <memory>
#include <numbers>

#include "deviascope/ensemble/memory_sink.h"
#include "deviascope/ensemble/sampler.h"
#include "deviascope/model/posterior.h"
#include "deviascope/summary/comparison.h"
#include "kolmogorov.h"
#include "summary/draw_moments.h"
#include "synthetic_counts.h"

using namespace deviascope;

namespace {

constexpr std::uint64_t seed = 20261203;

VectorPrior gaussian(double sd) {
    return {"gaussian",
            GaussianPrior{Eigen::Vector3d::Zero(), sd * sd * Eigen::Matrix3d::Identity()}};
}

const VectorPrior none("none", FixedPrior{});

/// A posterior and draws from it.
struct Sampled {
    std::unique_ptr<Posterior> posterior;
    CoordinateDraws draws;
    Eigen::MatrixXd velocity;  // 3 x draws
};

Sampled sample_from(const Counts& counts,
                    const ModelOptions& model,
                    std::uint64_t key,
                    double effective_draws) {
    Sampled sampled;
    sampled.posterior = std::make_unique<Posterior>(counts, model, key);
    EnsembleOptions options;
    options.seed = key;
    options.effective_draws = effective_draws;
    MemorySink sink;
    sample(*sampled.posterior, options, sink);
    sampled.draws = coordinate_draws(sampled.posterior->space(), sink.draws);
    sampled.velocity =
        Eigen::Map<const Eigen::MatrixXd>(
            sink.draws.value.data(), sink.draws.n_parameters, sampled.draws.size())
            .topRows(3);
    return sampled;
}

VelocityGaussian velocity_of(const Sampled& sampled) {
    const DrawMoments moments = moments_of(sampled.velocity);
    return {moments.mean, moments.covariance};
}

Eigen::Vector3d draw_vector(std::uint64_t which, std::uint64_t sky, double sd) {
    Stream stream(seed, Purpose::test, 100 + which, sky, 0);
    Eigen::Vector3d vector;
    for (double& one : vector) one = sd * normal(stream);
    return vector;
}

std::vector<synthetic::Survey> three_surveys() {
    const auto north = [](const Direction& n) { return n.z() > -0.4 ? 1.0 : 0.0; };
    const auto belt = [](const Direction& n) { return std::abs(n.z()) > 0.2 ? 0.8 : 0.0; };
    return {{"dunlin", {{"faint", 2e5, 2.5}, {"bright", 1e5, 7.0}}, {0, 0, 0}, north},
            {"lantern", {{"near", 1e5, 9.0}, {"far", 2e5, 2.0}}, {0, 0, 0}, belt},
            {"gnomon", {{"all", 3e5, 4.0}}}};
}

/// ln of the integral of the posterior over a grid in coordinates whitened by its Gaussian:
/// 11 nodes each way, 0.9 standard deviations apart (trapezoid: exponentially accurate for
/// smooth densities that vanish at the ends).
double integral_on_grid(const Posterior& posterior) {
    const CoordinateGaussian& about = *posterior.approximation();
    const Eigen::Index d = posterior.n_coordinates();
    constexpr int nodes = 11;
    constexpr double spacing = 0.9;
    Eigen::Index n = 1;
    for (Eigen::Index i = 0; i < d; ++i) n *= nodes;
    const Eigen::Index block = 14641;
    double sum = 0.0, largest = -1e300;
    for (Eigen::Index first = 0; first < n; first += block) {
        const Eigen::Index size = std::min(block, n - first);
        Eigen::MatrixXd at(d, size);
        for (Eigen::Index k = 0; k < size; ++k) {
            Eigen::VectorXd standard(d);
            Eigen::Index rest = first + k;
            for (double& one : standard) {
                one = spacing * (static_cast<double>(rest % nodes) - 5.0);
                rest /= nodes;
            }
            at.col(k) = about.mean + about.factor * standard;
        }
        Eigen::VectorXd log_posterior(size), log_likelihood(size);
        posterior.log_density(at, log_posterior, log_likelihood);
        const double top = std::max(largest, log_posterior.maxCoeff());
        sum = sum * std::exp(largest - top) + (log_posterior.array() - top).exp().sum();
        largest = top;
    }
    return largest + std::log(sum) + static_cast<double>(d) * std::log(spacing) +
           about.factor.diagonal().array().log().sum();
}

}  // namespace

TEST_CASE("evidence equals brute-force integration", "[summary]") {
    const std::vector<synthetic::Survey> surveys{three_surveys()[0]};
    const Counts counts = synthetic::make_counts(8, {0.004, -0.003, 0.002}, surveys, seed);
    const VectorPrior ball("ball", UniformVectorPrior{0.05});
    for (const VectorPrior& intrinsic : {none, gaussian(0.02)}) {
        const ModelOptions model = synthetic::make_model(surveys, ball, intrinsic);
        const Sampled sampled = sample_from(counts, model, seed, 4000);
        const double exact = integral_on_grid(*sampled.posterior);
        const Evidence found =
            evidence_of(*sampled.posterior, sampled.draws, {.seed = seed, .threads = 2});
        INFO(intrinsic.kind_name());
        CHECK(found.bridge.value == Approx(exact).epsilon(0).margin(0.02));
        CHECK(found.importance.value == Approx(exact).epsilon(0).margin(0.02));
    }
}

TEST_CASE("Savage-Dickey agrees with the difference of evidences, near and far", "[summary]") {
    // No intrinsic dipole inside a free one, for a sky without one and one with a large one.
    for (const double dipole : {0.0, 0.03}) {
        std::vector<synthetic::Survey> surveys{three_surveys()[0]};
        surveys[0].intrinsic = {0.0, dipole, 0.0};
        const Counts counts = synthetic::make_counts(8, {0.004, 0, 0.002}, surveys, seed);
        const Sampled wide = sample_from(
            counts, synthetic::make_model(surveys, gaussian(0.01), gaussian(0.02)), seed, 4000);
        const Sampled narrow = sample_from(
            counts, synthetic::make_model(surveys, gaussian(0.01), none), seed + 1, 4000);
        const EvidenceOptions options{.seed = seed};
        const Evidence outer = evidence_of(*wide.posterior, wide.draws, options);
        const Evidence inner = evidence_of(*narrow.posterior, narrow.draws, options);
        const auto points = tested_points(
            wide.posterior->space(), narrow.posterior->space(), wide.draws.size(), seed);
        REQUIRE(points);
        const LogEvidence ratio = savage_dickey(*wide.posterior, wide.draws, *points, options);
        const double difference = inner.bridge.value - outer.bridge.value;
        INFO(dipole);
        CHECK(
            std::abs(ratio.value - difference) <
            4.0 * std::hypot(ratio.error, std::hypot(inner.bridge.error, outer.bridge.error)) +
                0.005);
    }
}

TEST_CASE("errors of evidences from chains are honest", "[summary]") {
    const std::vector<synthetic::Survey> surveys{three_surveys()[1]};
    const Counts counts = synthetic::make_counts(8, {0.004, -0.003, 0.002}, surveys, seed);
    const ModelOptions model = synthetic::make_model(surveys, gaussian(0.01), gaussian(0.01));
    const double exact = integral_on_grid(Posterior(counts, model, seed));
    double square = 0.0;
    constexpr std::uint64_t n_seeds = 50;
    for (std::uint64_t s = 0; s < n_seeds; ++s) {
        const Sampled sampled = sample_from(counts, model, seed + s, 1000);
        const Evidence found = evidence_of(
            *sampled.posterior, sampled.draws, {.seed = seed + s, .proposal_draws = 1000});
        square += std::pow((found.bridge.value - exact) / found.bridge.error, 2);
    }
    // A chi-square of 50 degrees of freedom lies outside 24.6 … 86.7 twice in a thousand times.
    CHECK(square > 24.6);
    CHECK(square < 86.7);
}

namespace {

/// Skies whose truth is drawn from the priors: levels of the offset from a reference that was
/// measured with noise, and of the consistency of three surveys.
struct Levels {
    std::vector<double> offset, consistency, pair;
};

Levels levels_under_the_null(std::uint64_t n_skies) {
    constexpr double velocity_sd = 4e-3, intrinsic_sd = 3e-3, reference_sd = 1e-3;
    Levels levels;
    for (std::uint64_t sky = 0; sky < n_skies; ++sky) {
        const Eigen::Vector3d truth = draw_vector(0, sky, velocity_sd);
        std::vector<synthetic::Survey> surveys = three_surveys();
        for (std::uint64_t s = 0; s < 3; ++s)
            surveys[s].intrinsic = draw_vector(1 + s, sky, intrinsic_sd);
        const Counts counts = synthetic::make_counts(8, truth, surveys, seed + 1000 + sky);
        const VectorPrior prior = gaussian(velocity_sd);
        std::vector<std::optional<VelocityGaussian>> own;
        for (std::size_t s = 0; s < 3; ++s) {
            Counts one = counts;
            one.surveys = {counts.surveys[s]};
            const ModelOptions model =
                synthetic::make_model({surveys[s]}, prior, gaussian(intrinsic_sd));
            const VelocityGaussian velocity =
                velocity_of(sample_from(one, model, seed + sky, 2000));
            own.push_back(without_prior(velocity, prior));
            if (s > 0) continue;
            const Eigen::Vector3d reference = truth + draw_vector(9, sky, reference_sd);
            levels.offset.push_back(
                difference_of(velocity.mean - reference,
                              velocity.covariance +
                                  reference_sd * reference_sd * Eigen::Matrix3d::Identity())
                    .probability);
        }
        const Consistency all = consistency_of(own);
        if (all.n_surveys == 3) levels.consistency.push_back(all.probability);
        if (own[0] && own[1])
            levels.pair.push_back(difference_of(own[0]->mean - own[1]->mean,
                                                own[0]->covariance + own[1]->covariance)
                                      .probability);
    }
    return levels;
}

void check_uniform(const Levels& levels, std::size_t n_skies) {
    const auto itself = [](double p) { return p; };
    for (const auto* values : {&levels.offset, &levels.consistency, &levels.pair}) {
        CHECK(values->size() > n_skies * 9 / 10);
        CHECK(kolmogorov_distance(*values, itself) < 1.949);
    }
}

}  // namespace

TEST_CASE("levels of offset and consistency are uniform under the null", "[summary]") {
    check_uniform(levels_under_the_null(40), 40);
}

TEST_CASE("levels of offset and consistency are uniform under the null, 200 skies",
          "[.][long]") {
    check_uniform(levels_under_the_null(200), 200);
}

namespace {

/// ln evidence of "reference velocity and an intrinsic dipole" less that of "free velocity and
/// none", for one survey of two bins.
double intrinsic_against_motion(const Eigen::Vector3d& velocity,
                                const Eigen::Vector3d& dipole,
                                double faint_weight,
                                double bright_weight,
                                const VectorPrior& reference,
                                double dipole_sd,
                                double velocity_sd) {
    const std::vector<synthetic::Survey> surveys{
        {"dunlin", {{"faint", 1e6, faint_weight}, {"bright", 1e6, bright_weight}}, dipole}};
    const Counts counts = synthetic::make_counts(8, velocity, surveys, seed);
    const auto evidence = [&](const VectorPrior& v, const VectorPrior& d, std::uint64_t key) {
        const Sampled sampled =
            sample_from(counts, synthetic::make_model(surveys, v, d), key, 2000);
        return evidence_of(*sampled.posterior, sampled.draws, {.seed = key}).bridge.value;
    };
    return evidence(reference, gaussian(dipole_sd), seed) -
           evidence(gaussian(velocity_sd), none, seed + 1);
}

}  // namespace

TEST_CASE("the evidence tells motion from an intrinsic dipole where the bins do", "[summary]") {
    const Eigen::Vector3d reference(0.0, -1.0e-3, 0.7e-3), away(0.015, 0.01, 0.0);
    const VectorPrior held("reference",
                           GaussianPrior{reference, 1e-12 * Eigen::Matrix3d::Identity()});
    SECTION("an intrinsic dipole, bins that separate") {
        const double ln_bayes =
            intrinsic_against_motion(reference, away, 2.0, 8.0, held, 0.02, 0.005);
        CHECK(grade_of(ln_bayes) == "very strong");
    }
    SECTION("faster motion, bins that separate") {
        const double ln_bayes = intrinsic_against_motion(
            reference + away / 4.0, Eigen::Vector3d::Zero(), 2.0, 8.0, held, 0.02, 0.005);
        CHECK(grade_of(-ln_bayes) == "very strong");
    }
    SECTION("equal weights and priors of equal width in the dipole: undecided") {
        for (const bool motion : {true, false}) {
            const Eigen::Vector3d velocity = motion ? Eigen::Vector3d(away / 4.0) : reference;
            const double ln_bayes = intrinsic_against_motion(
                velocity,
                motion ? Eigen::Vector3d(Eigen::Vector3d::Zero()) : away,
                4.0,
                4.0,
                held,
                0.02,
                0.005);
            CHECK(grade_of(std::abs(ln_bayes)) == "undecided");
        }
    }
}

TEST_CASE("clumped sources widen the scatter by the root of the dispersion that is found",
          "[summary]") {
    // Each source is 1 + Poisson(0.3) components. Velocities at the mode, over 200 skies.
    std::vector<synthetic::Survey> surveys{
        {"dunlin", {{"one", 1e5, 4.0}}, {0, 0, 0}, [](const Direction& n) {
             return std::abs(n.z()) > 0.2 ? 1.0 : 0.0;
         }}};
    const VectorPrior ball("ball", UniformVectorPrior{0.5});
    std::vector<double> as_poisson, as_found;
    double dispersion = 0.0, square = 0.0;
    constexpr std::uint64_t n_skies = 200;
    for (std::uint64_t sky = 0; sky < n_skies; ++sky) {
        const Eigen::Vector3d truth = draw_vector(20, sky, 3e-3);
        surveys[0].bins[0].dispersion = 1.0;
        Counts counts = synthetic::make_counts(8, truth, surveys, seed + 5000 + sky);
        BinCounts& bin = counts.surveys[0].bins[0];
        for (std::size_t p = 0; p < bin.count.size(); ++p) {
            Stream stream(seed, Purpose::test, 200 + sky, p, 0);
            if (bin.count[p] > 0)
                bin.count[p] += synthetic::draw_poisson(stream, 0.3 * bin.count[p]);
        }
        const auto pulls = [&](std::vector<double>& out) {
            const Posterior posterior(counts, synthetic::make_model(surveys, ball, none), seed);
            const CoordinateGaussian& mode = *posterior.approximation();
            const Eigen::VectorXd pull =
                mode.factor.triangularView<Eigen::Lower>().solve(truth - mode.mean);
            for (const double one : pull) out.push_back(one);
            Eigen::VectorXd row = Eigen::VectorXd::Zero(posterior.space().n_parameters());
            row.head<3>() = mode.mean;
            row[posterior.space().terms()[0].weight] = 4.0;
            row[posterior.space().terms()[0].monopole] = NAN;
            return check_fit(counts,
                             posterior.space(),
                             row,
                             Eigen::MatrixXd::Zero(row.size(), row.size()),
                             1)[0]
                .dispersion;
        };
        surveys[0].bins[0].dispersion = pulls(as_poisson);
        dispersion += surveys[0].bins[0].dispersion / static_cast<double>(n_skies);
        pulls(as_found);
    }
    for (const double pull : as_poisson) square += pull * pull;
    const double inflation = std::sqrt(square / static_cast<double>(as_poisson.size()));
    // 600 pulls: the spread is known to 1 / sqrt(1200) = 2.9 %.
    CHECK(inflation == Approx(std::sqrt(dispersion)).epsilon(4.0 * 0.029));
    CHECK(dispersion == Approx(1.99 / 1.3).epsilon(0.02));
    const auto rank = [](double pull) { return 0.5 * std::erfc(-pull / std::numbers::sqrt2); };
    CHECK(kolmogorov_distance(as_found, rank) < 1.949);
}
