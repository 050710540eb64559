// SPDX-License-Identifier: GPL-2.0-or-later
// Outside truth: grid_posterior.py (NumPy, brute force); see README.md here.
#include <fmt/format.h>

#include <catch2/catch.hpp>
#include <cmath>
#include <sstream>

#include "deviascope/ensemble/diagnostics.h"
#include "deviascope/ensemble/memory_sink.h"
#include "deviascope/ensemble/sampler.h"
#include "deviascope/model/posterior.h"
#include "python_check.h"
#include "simulated_sky.h"
#include "temporary_folder.h"

using namespace deviascope;

namespace {

constexpr double max_velocity = 0.2;
constexpr double max_intrinsic = 0.4;

/// A sky at nside 4 with a true velocity along z and a true intrinsic dipole along x.
Counts small_sky() {
    test::SkyTruth truth;
    truth.velocity = {0.0, 0.0, 0.03};
    truth.intrinsic = {Eigen::Vector3d(0.08, 0.0, 0.0)};
    truth.weight = {Eigen::Vector2d(2.5, 6.0)};
    truth.monopole = {Eigen::Vector2d(300.0, 150.0)};
    Stream stream(4711, Purpose::test, 0, 0, 0);
    return test::simulate_sky(truth, 4, stream);
}

ModelOptions small_model() {
    ModelOptions model;
    model.velocity = VectorPrior("axis", AxisPrior{Direction::UnitZ(), max_velocity});
    SurveyModel survey;
    survey.bins.resize(2);
    survey.weights.mean = Eigen::Vector2d(2.5, 6.0);
    survey.weights.covariance = Eigen::Matrix2d::Zero();
    survey.intrinsic = VectorPrior("axis", AxisPrior{Direction::UnitX(), max_intrinsic});
    model.surveys.push_back(survey);
    return model;
}

std::string as_table(const Counts& counts) {
    const Pixelisation grid(counts.nside);
    const SurveyCounts& survey = counts.surveys.front();
    std::string text;
    for (std::size_t k = 0; k < survey.footprints[0].pixel.size(); ++k) {
        const Direction n = grid.centre(survey.footprints[0].pixel[k]);
        text +=
            fmt::format("{} {} {} {}", n.x(), n.y(), n.z(), survey.footprints[0].exposure[k]);
        for (const BinCounts& bin : survey.bins) text += fmt::format(" {}", bin.count[k]);
        text += '\n';
    }
    return text;
}

struct Moments {
    double mean_velocity, sd_velocity, mean_intrinsic, sd_intrinsic, correlation;
};

Moments moments_by_grid(const Counts& counts) {
    const test::TemporaryFolder folder;
    const auto table = folder.write("sky.txt", as_table(counts));
    const auto result = test::run_python(std::filesystem::path(DEVIASCOPE_TEST_DATA) /
                                             "reference/grid_posterior/grid_posterior.py",
                                         {table.string(),
                                          fmt::format("{}", max_velocity),
                                          fmt::format("{}", max_intrinsic),
                                          "2.5",
                                          "6.0"});
    INFO(result.output);
    REQUIRE(result.exit_code == 0);
    Moments m{};
    std::istringstream(result.output) >> m.mean_velocity >> m.sd_velocity >> m.mean_intrinsic >>
        m.sd_intrinsic >> m.correlation;
    return m;
}

}  // namespace

TEST_CASE("a sampled posterior agrees with brute force on a grid", "[model][ensemble]") {
    const Counts counts = small_sky();
    const Moments grid = moments_by_grid(counts);
    const Posterior posterior(counts, small_model());
    REQUIRE(posterior.n_coordinates() == 2);
    EnsembleOptions options;
    options.seed = 20260817;
    options.effective_draws = 20000;
    MemorySink sink;
    REQUIRE(sample(posterior, options, sink).end == Outcome::End::converged);

    const Draws& draws = sink.draws;
    double sum_b = 0, sum_d = 0, sum_bb = 0, sum_dd = 0, sum_bd = 0;
    const Eigen::Index n = draws.n_rows * draws.n_replicates * draws.n_walkers;
    for (Eigen::Index k = 0; k < n; ++k) {
        const double* row = draws.value.data() + k * draws.n_parameters;
        const double b = row[2];
        const double d = row[3];
        sum_b += b, sum_d += d, sum_bb += b * b, sum_dd += d * d, sum_bd += b * d;
    }
    const double count = static_cast<double>(n);
    const double mean_b = sum_b / count, mean_d = sum_d / count;
    const double sd_b = std::sqrt(sum_bb / count - mean_b * mean_b);
    const double sd_d = std::sqrt(sum_dd / count - mean_d * mean_d);
    const double correlation = (sum_bd / count - mean_b * mean_d) / (sd_b * sd_d);
    // 20,000 effective draws: standard error of a mean sd / 141, of an sd about sd / 200, of
    // the correlation at most 1 / 141; five of each are allowed.
    CHECK(std::abs(mean_b - grid.mean_velocity) < 5 * grid.sd_velocity / 141);
    CHECK(std::abs(mean_d - grid.mean_intrinsic) < 5 * grid.sd_intrinsic / 141);
    CHECK(std::abs(sd_b / grid.sd_velocity - 1) < 5.0 / 200);
    CHECK(std::abs(sd_d / grid.sd_intrinsic - 1) < 5.0 / 200);
    CHECK(std::abs(correlation - grid.correlation) < 5.0 / 141);
}
