// SPDX-License-Identifier: GPL-2.0-or-later
// Whole posteriors under different kernels, and against importance sampling.
#include <algorithm>
#include <catch2/catch.hpp>
#include <cmath>

#include "deviascope/ensemble/diagnostics.h"
#include "deviascope/ensemble/memory_sink.h"
#include "deviascope/ensemble/monitored.h"
#include "deviascope/ensemble/sampler.h"
#include "deviascope/model/posterior.h"
#include "kolmogorov.h"
#include "synthetic_counts.h"

using namespace deviascope;

namespace {

constexpr std::uint64_t seed = 20261201;
constexpr KernelFractions stretch_alone{1.0, 0.0, 0.0};
constexpr KernelFractions all_kernels{};

std::vector<synthetic::Survey> surveys() {
    const auto cap = [](const Direction& n) { return std::abs(n.z()) > 0.25 ? 1.0 : 0.0; };
    return {{"dunlin",
             {{"faint", 1e5, 3.0, 0.1}, {"bright", 1e5, 8.0, 0.2}},
             {0.01, 0.0, -0.01},
             cap},
            {"lantern", {{"one", 2e5, 5.0, 0.3}}, {0.0, 0.005, 0.01}}};
}

Counts make_counts() {
    return synthetic::make_counts(8, {0.004, 0.002, -0.005}, surveys(), seed);
}

const VectorPrior modest("modest",
                         GaussianPrior{Eigen::Vector3d::Zero(),
                                       4e-4 * Eigen::Matrix3d::Identity()});

struct Sampled {
    Outcome outcome;
    Draws draws;
    std::vector<ScalarDiagnostics> diagnostics;
    std::vector<MonitoredScalar> scalars;
};

Sampled sample_with(const Posterior& target, const KernelFractions& kernels, double wanted) {
    EnsembleOptions options;
    options.seed = seed;
    options.kernels = kernels;
    options.effective_draws = wanted;
    options.threads = 2;
    MemorySink sink;
    Sampled sampled;
    sampled.outcome = sample(target, options, sink);
    sampled.draws = std::move(sink.draws);
    sampled.scalars = monitored_scalars(target.parameters(), target.vectors());
    sampled.diagnostics =
        diagnose(sampled.scalars, sampled.draws, sampled.outcome.store_every, 2);
    return sampled;
}

std::vector<double> values_of(const Sampled& sampled, const MonitoredScalar& scalar) {
    std::vector<double> values;
    const Draws& draws = sampled.draws;
    for (Eigen::Index at = 0; at < draws.n_rows * draws.n_replicates * draws.n_walkers; ++at)
        values.push_back(scalar.value(draws.row_of(0, 0, at)));
    return values;
}

struct Estimate {
    double mean = 0.0, error = 0.0;
};

Estimate estimate(const std::vector<double>& values, double effective) {
    const auto n = static_cast<double>(values.size());
    Estimate found;
    for (const double x : values) found.mean += x / n;
    double variance = 0.0;
    for (const double x : values) variance += (x - found.mean) * (x - found.mean) / n;
    found.error = std::sqrt(variance / effective);
    return found;
}

/// Means by importance sampling: draws of a Student-t (5 degrees of freedom) about the Laplace
/// approximation, weighted by posterior over proposal.
std::vector<Estimate> by_importance(const Posterior& target,
                                    const std::vector<MonitoredScalar>& scalars) {
    constexpr Eigen::Index n_draws = 60000;
    constexpr double degrees = 5.0;
    const CoordinateGaussian& gaussian = *target.approximation();
    const Eigen::Index n = target.n_coordinates();
    Eigen::MatrixXd points(n, n_draws);
    Eigen::VectorXd log_weight(n_draws), likelihood(n_draws);
    Eigen::VectorXd log_proposal(n_draws);
    for (Eigen::Index draw = 0; draw < n_draws; ++draw) {
        Stream stream(seed, Purpose::test, 1, static_cast<std::uint64_t>(draw), 0);
        Eigen::VectorXd standard(n);
        for (double& component : standard) component = normal(stream);
        double chi_square = 0.0;
        for (int k = 0; k < 5; ++k) chi_square += std::pow(normal(stream), 2);
        standard *= std::sqrt(degrees / chi_square);
        points.col(draw) = gaussian.mean + gaussian.factor * standard;
        log_proposal[draw] = -0.5 * (degrees + static_cast<double>(n)) *
                             std::log1p(standard.squaredNorm() / degrees);
    }
    target.log_density(points, log_weight, likelihood);
    Eigen::VectorXd weight = log_weight - log_proposal;
    weight = (weight.array() - weight.maxCoeff()).exp();
    weight /= weight.sum();
    Eigen::MatrixXd rows(static_cast<Eigen::Index>(target.parameters().size()), n_draws);
    target.to_parameters(points, rows);
    std::vector<Estimate> estimates;
    for (const MonitoredScalar& scalar : scalars) {
        Eigen::VectorXd value(n_draws);
        for (Eigen::Index draw = 0; draw < n_draws; ++draw)
            value[draw] = scalar.value(rows.col(draw).data());
        Estimate found;
        found.mean = weight.dot(value);
        // The usual error of a ratio of means.
        found.error = std::sqrt((weight.array() * (value.array() - found.mean)).square().sum());
        estimates.push_back(found);
    }
    return estimates;
}

void check_same(const Estimate& a, const Estimate& b) {
    CHECK(std::abs(a.mean - b.mean) < 4.0 * std::hypot(a.error, b.error));
}

/// Every k-th value, so that what is left is nearly independent.
std::vector<double> thinned(const std::vector<double>& values, double effective) {
    const auto every = static_cast<std::size_t>(
        std::max(1.0, std::ceil(2.0 * static_cast<double>(values.size()) / effective)));
    std::vector<double> some;
    for (std::size_t at = 0; at < values.size(); at += every) some.push_back(values[at]);
    return some;
}

Estimate estimate_of(const Sampled& sampled, std::size_t k) {
    return estimate(values_of(sampled, sampled.scalars[k]),
                    sampled.diagnostics[k].effective_draws());
}

/// Means of every scalar within four standard errors.
void check_same_means(const Sampled& a, const Sampled& b) {
    for (std::size_t k = 0; k < a.scalars.size(); ++k) {
        const std::vector<double> values = values_of(b, b.scalars[k]);
        const auto [least, most] = std::minmax_element(values.begin(), values.end());
        if (*least == *most) continue;  // a direction along a fixed axis
        INFO(a.scalars[k].name);
        check_same(estimate_of(a, k), estimate_of(b, k));
    }
}

/// Thinned draws of every scalar pass for draws of one distribution.
void check_same_distributions(const Sampled& a, const Sampled& b) {
    const auto nearly_independent = [](const Sampled& sampled, std::size_t k) {
        return thinned(values_of(sampled, sampled.scalars[k]),
                       sampled.diagnostics[k].effective_draws());
    };
    for (std::size_t k = 0; k < a.scalars.size(); ++k) {
        INFO(a.scalars[k].name);
        CHECK(smirnov_distance(nearly_independent(a, k), nearly_independent(b, k)) < 2.225);
    }
}

/// More than a tenth of the independence kernel's proposals are taken.
void check_independence_moves(const Sampled& sampled) {
    const auto independence = static_cast<std::size_t>(Kernel::independence);
    CHECK(sampled.outcome.tally.taken[independence] * 10 >
          sampled.outcome.tally.tried[independence]);
}

}  // namespace

TEST_CASE("stretch alone, all kernels and importance sampling find one posterior", "[model]") {
    const Counts counts = make_counts();
    const Posterior target(
        counts, synthetic::make_model(surveys(), {"free", UniformVectorPrior{0.05}}, modest));
    const Sampled stretched = sample_with(target, stretch_alone, 4000);
    const Sampled mixed = sample_with(target, all_kernels, 20000);
    CHECK(stretched.outcome.end == Outcome::End::converged);
    CHECK(mixed.outcome.end == Outcome::End::converged);
    CHECK(mixed.outcome.steps * 10 < stretched.outcome.steps);
    check_same_means(stretched, mixed);
    check_same_distributions(stretched, mixed);
    const std::vector<Estimate> weighted = by_importance(target, mixed.scalars);
    for (std::size_t k = 0; k < mixed.scalars.size(); ++k) {
        INFO(mixed.scalars[k].name);
        const Estimate by_all = estimate_of(mixed, k);
        check_same(weighted[k], by_all);
        CHECK(weighted[k].error < 10.0 * by_all.error);
    }
}

TEST_CASE("a velocity held by the bound of its prior is sampled right", "[model]") {
    // The truth, 0.0067, lies well outside the ball: the posterior sits on its surface.
    const Counts counts = make_counts();
    const Posterior target(
        counts, synthetic::make_model(surveys(), {"short", UniformVectorPrior{0.004}}, modest));
    const Sampled stretched = sample_with(target, stretch_alone, 4000);
    const Sampled mixed = sample_with(target, all_kernels, 20000);
    CHECK(mixed.outcome.end == Outcome::End::converged);
    check_independence_moves(mixed);
    check_same_means(stretched, mixed);
    check_same_distributions(stretched, mixed);
}

TEST_CASE("dipoles of two surveys far beyond their bounds are sampled right", "[model]") {
    // Each is 0.02 long and held to 0.004, dozens of its errors away: next to the bound the
    // density is exponential.
    std::vector<synthetic::Survey> strong;
    for (int s = 0; s < 2; ++s)
        strong.push_back({"survey-" + std::to_string(s),
                          {{"one", 1e7, 3.0}},
                          {0.02 * std::cos(s), 0.02 * std::sin(s), 0.0}});
    const Counts counts = synthetic::make_counts(8, {0.0, 0.0, 0.0}, strong, seed);
    const Posterior target(
        counts,
        synthetic::make_model(
            strong, {"none", FixedPrior{}}, {"short", UniformAmplitudePrior{0.004}}));
    const Sampled stretched = sample_with(target, stretch_alone, 1000);
    const Sampled mixed = sample_with(target, all_kernels, 10000);
    CHECK(mixed.outcome.end == Outcome::End::converged);
    check_same_means(stretched, mixed);
}

TEST_CASE("a velocity known to 10^-7 of its own keeps its prior", "[model]") {
    // The prior of the CMB velocity (Planck 2018: 369.82 +- 0.11 km/s) beside weights of order
    // 10: coordinates span eight decades.
    const GaussianPrior known = gaussian_of(
        {369.82, 0.11, 264.021, 0.011, 48.253, 0.005, Frame::galactic}, Frame::galactic);
    const Counts counts = make_counts();
    const Posterior target(counts, synthetic::make_model(surveys(), {"known", known}, modest));
    const Sampled mixed = sample_with(target, all_kernels, 10000);
    CHECK(mixed.outcome.end == Outcome::End::converged);
    for (std::size_t axis = 0; axis < 3; ++axis) {
        const std::vector<double> values = values_of(mixed, mixed.scalars[axis]);
        const Estimate found = estimate(values, mixed.diagnostics[axis].effective_draws());
        const auto a = static_cast<Eigen::Index>(axis);
        const double sd = std::sqrt(known.covariance(a, a));
        CHECK(std::abs(found.mean - known.mean[a]) < 5.0 * found.error);
        CHECK(found.error * std::sqrt(mixed.diagnostics[axis].effective_draws()) ==
              Approx(sd).epsilon(0.05));
    }
}

TEST_CASE("dipoles that the bins hardly separate are sampled right", "[model]") {
    // Equal weights: only the priors divide the sum between velocity and intrinsic dipole.
    std::vector<synthetic::Survey> alike = {
        {"dunlin", {{"faint", 1e5, 4.0, 0.1}, {"bright", 1e5, 4.0, 0.1}}, {0.0, 0.0, 0.01}}};
    const Counts counts = synthetic::make_counts(8, {0.002, 0.0, 0.0}, alike, seed);
    const Posterior target(
        counts, synthetic::make_model(alike, {"free", UniformVectorPrior{0.05}}, modest));
    const Sampled stretched = sample_with(target, stretch_alone, 4000);
    const Sampled mixed = sample_with(target, all_kernels, 10000);
    CHECK(mixed.outcome.end == Outcome::End::converged);
    check_same_means(stretched, mixed);
}

namespace {

ModelOptions model_with(const VectorPrior& velocity, bool monopoles_sampled) {
    ModelOptions model = synthetic::make_model(surveys(), velocity, modest);
    model.monopole.sampled = monopoles_sampled;
    return model;
}

struct Kind {
    const char* name;
    ModelOptions model;
};

std::vector<Kind> kinds() {
    const Direction ahead = Direction(0.004, 0.002, -0.005).normalized();
    std::vector<Kind> all = {
        {"axis", model_with({"axis", AxisPrior{ahead, 0.05}}, false)},
        {"axis, held by 0", model_with({"axis", AxisPrior{-ahead, 0.05}}, false)},
        {"uniform-amplitude", model_with({"amplitude", UniformAmplitudePrior{0.05}}, false)},
        {"monopoles sampled", model_with({"free", UniformVectorPrior{0.05}}, true)},
        {"no motion", model_with({"none", FixedPrior{}}, false)},
        {"shared dipole", model_with({"free", UniformVectorPrior{0.05}}, false)}};
    all.back().model.intrinsic_shared = true;
    return all;
}

}  // namespace

TEST_CASE("every kind of prior gives one posterior under stretch alone and all kernels",
          "[model]") {
    const Counts counts = make_counts();
    for (const Kind& kind : kinds()) {
        const Posterior target(counts, kind.model);
        const Sampled stretched = sample_with(target, stretch_alone, 2000);
        const Sampled mixed = sample_with(target, all_kernels, 10000);
        INFO(kind.name);
        CHECK(mixed.outcome.end == Outcome::End::converged);
        check_independence_moves(mixed);
        check_same_means(stretched, mixed);
    }
}

TEST_CASE("the Laplace approximation has the mode and the curvature of the density",
          "[model]") {
    // Central differences of the log density itself, in units of the approximation's widths.
    const Counts counts = make_counts();
    for (const bool sampled : {false, true}) {
        ModelOptions model = model_with({"free", UniformVectorPrior{0.05}}, sampled);
        model.engine.engine = Engine::pixel;
        const Posterior target(counts, model);
        const CoordinateGaussian& gaussian = *target.approximation();
        const Eigen::Index n = target.n_coordinates();
        constexpr double step = 0.02;
        const auto value = [&](const Eigen::VectorXd& standard) {
            Eigen::VectorXd posterior(1), likelihood(1);
            target.log_density(
                gaussian.mean + gaussian.factor * standard, posterior, likelihood);
            return posterior[0];
        };
        for (Eigen::Index i = 0; i < n; ++i)
            for (Eigen::Index j = 0; j <= i; ++j) {
                const Eigen::VectorXd di = step * Eigen::VectorXd::Unit(n, i);
                const Eigen::VectorXd dj = step * Eigen::VectorXd::Unit(n, j);
                const double curvature =
                    (value(di + dj) - value(di - dj) - value(dj - di) + value(-di - dj)) /
                    (4.0 * step * step);
                INFO("coordinates " << i << " and " << j);
                CHECK(curvature == Approx(i == j ? -1.0 : 0.0).margin(2e-3));
                if (i == j)
                    CHECK((value(di) - value(-di)) / (2.0 * step) == Approx(0.0).margin(2e-3));
            }
    }
}
