// SPDX-License-Identifier: GPL-2.0-or-later
// A dipole far below the noise under a prior uniform in amplitude: the density in the vector is
// singular at zero, so walkers must be moved in the coordinates of the README.
#include <catch2/catch.hpp>
#include <cmath>
#include <numeric>

#include "deviascope/ensemble/memory_sink.h"
#include "deviascope/ensemble/sampler.h"
#include "deviascope/model/posterior.h"
#include "simulated_sky.h"

using namespace deviascope;

namespace {

constexpr double largest = 0.5;

ModelOptions faint_model() {
    ModelOptions model;
    SurveyModel survey;
    survey.bins.resize(1);
    survey.weights.mean = Eigen::VectorXd::Constant(1, 3.75);
    survey.weights.covariance = Eigen::MatrixXd::Zero(1, 1);
    survey.intrinsic = VectorPrior("uniform-amplitude", UniformAmplitudePrior{largest});
    model.surveys.push_back(survey);
    return model;
}

Counts isotropic_sky() {
    test::SkyTruth truth;
    truth.intrinsic = {Eigen::Vector3d::Zero()};
    truth.weight = {Eigen::VectorXd::Constant(1, 3.75)};
    truth.monopole = {Eigen::VectorXd::Constant(1, 8000.0)};
    Stream stream(1234, Purpose::test, 0, 0, 0);
    return test::simulate_sky(truth, 8, stream);
}

/// Likelihood averaged over directions at amplitude r, relative to the isotropic sky: the
/// posterior density of r under a flat prior in r, unnormalised.
double density_of_amplitude(const Posterior& posterior, double r) {
    const VectorPrior& prior = posterior.space().vector_prior(1);
    const std::vector<Direction> directions = Pixelisation(8).centres();
    Eigen::MatrixXd coordinates(3, std::ssize(directions));
    for (std::size_t k = 0; k < directions.size(); ++k)
        coordinates.col(static_cast<Eigen::Index>(k)) = prior.coordinates_of(r * directions[k]);
    Eigen::VectorXd log_posterior(coordinates.cols());
    Eigen::VectorXd log_likelihood(coordinates.cols());
    posterior.log_density(coordinates, log_posterior, log_likelihood);
    return log_likelihood.array().exp().mean();
}

/// P(amplitude < r_small) by the midpoint rule in one dimension.
double probability_by_quadrature(const Posterior& posterior, double r_small, double sd) {
    constexpr int n_small = 20, n_all = 1600;
    const double r_all = 16.0 * sd;
    const auto integral = [&](double end, int n) {
        double sum = 0.0;
        for (int k = 0; k < n; ++k) sum += density_of_amplitude(posterior, (k + 0.5) * end / n);
        return sum * end / n;
    };
    return integral(r_small, n_small) / integral(r_all, n_all);
}

double probability_by_sampling(const Posterior& posterior, double r_small, std::uint64_t seed) {
    EnsembleOptions options;
    options.seed = seed;
    MemorySink sink;
    REQUIRE(sample(posterior, options, sink).end == Outcome::End::converged);
    const Draws& draws = sink.draws;
    const Eigen::Index n = draws.n_rows * draws.n_replicates * draws.n_walkers;
    Eigen::Index n_small = 0;
    for (Eigen::Index k = 0; k < n; ++k) {
        const double* row = draws.value.data() + k * draws.n_parameters;
        if (std::hypot(row[3], row[4], row[5]) < r_small) ++n_small;
    }
    return static_cast<double>(n_small) / static_cast<double>(n);
}

}  // namespace

TEST_CASE("a faint dipole under uniform-amplitude keeps its probability near zero",
          "[model][ensemble]") {
    const Counts counts = isotropic_sky();
    const Posterior posterior(counts, faint_model());
    const double n_sources = static_cast<double>(counts.surveys[0].bins[0].total());
    const double sd = std::sqrt(3.0 / n_sources);
    const double r_small = 0.02 * sd;
    const double expected = probability_by_quadrature(posterior, r_small, sd);

    constexpr int n_seeds = 10;
    std::vector<double> found;
    for (std::uint64_t seed = 1; seed <= n_seeds; ++seed)
        found.push_back(probability_by_sampling(posterior, r_small, seed));
    const double mean = std::accumulate(found.begin(), found.end(), 0.0) / n_seeds;
    double squares = 0.0;
    for (const double p : found) squares += (p - mean) * (p - mean);
    const double error = std::sqrt(squares / (n_seeds - 1) / n_seeds);
    INFO("expected " << expected << ", found " << mean << " +- " << error);
    CHECK(error < 0.1 * expected);  // else the test could not see a wrong density
    // Student's t with 9 degrees of freedom: 4.78 is exceeded with probability 0.001.
    CHECK(std::abs(mean - expected) < 4.78 * error);
}
