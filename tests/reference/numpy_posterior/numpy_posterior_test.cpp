// SPDX-License-Identifier: GPL-2.0-or-later
// Values: values.csv of this folder, written by posterior.py (see README.md).
#include <catch2/catch.hpp>
#include <cmath>
#include <fstream>
#include <sstream>
#include <vector>

#include "deviascope/model/posterior.h"
#include "exact_posterior.h"
#include "reference_problem.h"

using namespace deviascope;

namespace {

/// A row of values.csv: 36 coordinates and the log posterior.
struct Values {
    std::string totals;  ///< sources of each survey, as written
    Eigen::MatrixXd points{36, 16};
    Eigen::VectorXd log_posterior{16};
};

Values read_values() {
    std::ifstream file(DEVIASCOPE_TEST_DATA "/reference/numpy_posterior/values.csv");
    REQUIRE(file);
    Values values;
    std::getline(file, values.totals);
    std::string line, number;
    for (Eigen::Index row = 0; std::getline(file, line); ++row) {
        std::istringstream fields(line);
        for (Eigen::Index k = 0; std::getline(fields, number, ','); ++k)
            (k < 36 ? values.points(k, row) : values.log_posterior[row]) = std::stod(number);
    }
    return values;
}

}  // namespace

TEST_CASE("log-posterior differences equal those of a plain NumPy script", "[model]") {
    const Values values = read_values();
    const Counts counts = reference_problem::make_counts();
    std::string totals = "# sources of each survey:";
    for (const SurveyCounts& survey : counts.surveys) {
        std::int64_t total = 0;
        for (const BinCounts& bin : survey.bins) total += bin.total();
        totals += " " + std::to_string(total);
    }
    REQUIRE(totals == values.totals);
    const Posterior target(counts, reference_problem::make_model());
    REQUIRE(target.n_coordinates() == 36);
    Eigen::VectorXd posterior(16), likelihood(16);
    target.log_density(values.points, posterior, likelihood);
    for (Eigen::Index k = 0; k < 16; ++k) {
        INFO("point " << k);
        const double expected = values.log_posterior[k] - values.log_posterior[0];
        CHECK(std::abs(posterior[k] - posterior[0] - expected) < 1e-6);
    }
    // And an 80-bit sum, at two of the points.
    for (const Eigen::Index k : {3, 15}) {
        Eigen::VectorXd row(target.space().n_parameters());
        target.space().to_parameters(values.points.col(k), row);
        const auto truth = exact::log_likelihood(counts, target.space(), row);
        CHECK(std::abs(static_cast<double>(likelihood[k] - truth)) < 1e-7);
    }
}
