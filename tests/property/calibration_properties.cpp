// SPDX-License-Identifier: GPL-2.0-or-later
// Simulation-based calibration (Talts, Betancourt, Simpson, Vehtari & Gelman 2018,
// arXiv 1804.06788): where the truth is drawn from the priors, its rank among L independent
// draws of the posterior is uniform on 0 … L.
#include <algorithm>
#include <boost/math/distributions/chi_squared.hpp>
#include <catch2/catch.hpp>
#include <map>
#include <string>

#include "deviascope/core/parallel.h"
#include "deviascope/ensemble/memory_sink.h"
#include "deviascope/ensemble/monitored.h"
#include "deviascope/ensemble/sampler.h"
#include "deviascope/model/posterior.h"
#include "simulated_sky.h"

using namespace deviascope;
using deviascope::MemorySink;
using deviascope::test::SkyTruth;

namespace {

constexpr int n_ranked = 99;  // L: ranks 0 … 99
constexpr std::uint64_t calibration_seed = 20260817;

/// Two surveys of two bins each, unlike weights, all priors proper.
ModelOptions calibration_model() {
    ModelOptions model;
    model.velocity = VectorPrior("uniform-vector", UniformVectorPrior{0.1});
    model.monopole = {400.0, 0.1, false};  // 4,000 a steradian, +- 5 %
    for (const double sd : {0.03, 0.05}) {
        SurveyModel survey;
        survey.bins.resize(2);
        survey.weights.mean = Eigen::Vector2d(1.5, 6.0);
        survey.weights.covariance = Eigen::Vector2d(0.04, 0.25).asDiagonal();
        survey.intrinsic = VectorPrior(
            "gaussian",
            GaussianPrior{Eigen::Vector3d::Zero(), sd * sd * Eigen::Matrix3d::Identity()});
        model.surveys.push_back(survey);
    }
    return model;
}

/// The row of parameters that the truth would be.
Eigen::VectorXd true_row(const SkyTruth& truth, Eigen::Index n_parameters) {
    Eigen::VectorXd row(n_parameters);
    Eigen::Index at = 0;
    row.segment<3>(at) = truth.velocity;
    for (const Eigen::Vector3d& vector : truth.intrinsic) row.segment<3>(at += 3) = vector;
    at += 3;
    for (const auto& values : {truth.weight, truth.monopole})
        for (const Eigen::VectorXd& survey : values) {
            row.segment(at, survey.size()) = survey;
            at += survey.size();
        }
    return row;
}

/// What is ranked: every parameter, monopoles too, and every amplitude.
std::vector<MonitoredScalar> ranked_scalars(const Posterior& posterior) {
    std::vector<MonitoredScalar> scalars;
    for (std::size_t p = 0; p < posterior.parameters().size(); ++p)
        scalars.push_back({posterior.parameters()[p].name,
                           MonitoredScalar::Kind::parameter,
                           static_cast<Eigen::Index>(p),
                           0});
    for (const VectorParameter& vector : posterior.vectors())
        scalars.push_back(
            {vector.name + ".amplitude", MonitoredScalar::Kind::amplitude, vector.first, 0});
    return scalars;
}

/// Ranks of the truth among L draws of one sky, one for each scalar. The draws are the last
/// stored rows of walkers far apart in the ensembles, so nearly independent.
std::vector<int> ranks_of_sky(std::uint64_t sky) {
    const ModelOptions model = calibration_model();
    Stream truth_stream(calibration_seed, Purpose::test, sky, 0, 0);
    const SkyTruth truth = test::draw_truth(model, truth_stream);
    Stream count_stream(calibration_seed, Purpose::test, sky, 1, 0);
    const Counts counts = test::simulate_sky(truth, 8, count_stream);
    const Posterior posterior(counts, model);

    EnsembleOptions options;
    options.seed = calibration_seed + 1 + sky;
    options.replicates = 4;
    options.effective_draws = 1000;
    MemorySink sink;
    const Outcome outcome = sample(posterior, options, sink);
    if (outcome.end != Outcome::End::converged) throw std::runtime_error("not converged");

    // L draws evenly spread over everything stored, in (row, replicate, walker) order.
    const Draws& draws = sink.draws;
    const Eigen::Index n_stored = draws.n_rows * draws.n_replicates * draws.n_walkers;
    const Eigen::VectorXd true_values = true_row(truth, draws.n_parameters);
    std::vector<int> ranks;
    for (const MonitoredScalar& scalar : ranked_scalars(posterior)) {
        int rank = 0;
        for (int draw = 0; draw < n_ranked; ++draw) {
            const Eigen::Index at = (2 * draw + 1) * n_stored / (2 * n_ranked);
            const double* row = draws.value.data() + at * draws.n_parameters;
            if (scalar.value(row) < scalar.value(true_values.data())) ++rank;
        }
        ranks.push_back(rank);
    }
    return ranks;
}

/// Chi-square probability that ranks are uniform, over `n_bins` equal bins of 0 … L.
double uniformity(const std::vector<int>& ranks, int n_bins) {
    std::vector<double> filled(static_cast<std::size_t>(n_bins), 0.0);
    for (const int rank : ranks)
        filled[static_cast<std::size_t>(rank * n_bins / (n_ranked + 1))] += 1.0;
    const double expected = static_cast<double>(ranks.size()) / n_bins;
    double chi2 = 0.0;
    for (const double n : filled) chi2 += (n - expected) * (n - expected) / expected;
    return boost::math::cdf(
        boost::math::complement(boost::math::chi_squared(n_bins - 1), chi2));
}

void check_calibration(std::size_t n_skies, int n_bins) {
    std::vector<std::vector<int>> ranks(n_skies);
    parallel_for(
        n_skies, default_threads(), [&](std::size_t sky) { ranks[sky] = ranks_of_sky(sky); });
    Stream stream(calibration_seed, Purpose::test, 0, 0, 0);
    const ModelOptions model = calibration_model();
    const Counts counts = test::simulate_sky(test::draw_truth(model, stream), 8, stream);
    const std::vector<MonitoredScalar> scalars = ranked_scalars(Posterior(counts, model));
    REQUIRE_FALSE(scalars.empty());
    for (std::size_t scalar = 0; scalar < scalars.size(); ++scalar) {
        std::vector<int> of_scalar;
        for (const std::vector<int>& sky : ranks) of_scalar.push_back(sky[scalar]);
        const double p = uniformity(of_scalar, n_bins);
        UNSCOPED_INFO(scalars[scalar].name << ": p = " << p);
        CHECK(p > 0.001);
    }
}

}  // namespace

TEST_CASE("ranks of the truth are uniform, 40 skies", "[model][ensemble]") {
    check_calibration(40, 5);
}

TEST_CASE("ranks of the truth are uniform, 300 skies", "[.long][model][ensemble]") {
    check_calibration(300, 20);
}
