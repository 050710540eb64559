// SPDX-License-Identifier: GPL-2.0-or-later
// The two deterministic count maps of tests/reference/poisson_regression.
#pragma once

#include <cmath>
#include <cstdint>
#include <vector>

#include "deviascope/counts/count_map.h"
#include "deviascope/model/model_options.h"
#include "synthetic_counts.h"

namespace poisson_data {

/// floor(a (1 + d.n_i)) + (k i mod m) at RING pixel centres of nside 8.
inline std::vector<std::uint32_t> counts_of(double a,
                                            const Eigen::Vector3d& d,
                                            std::int64_t k,
                                            std::int64_t m) {
    const deviascope::Pixelisation grid(8);
    std::vector<std::uint32_t> count;
    for (std::int64_t i = 0; i < grid.n_pixels(); ++i)
        count.push_back(static_cast<std::uint32_t>(
            static_cast<std::int64_t>(std::floor(a * (1.0 + d.dot(grid.centre(i))))) +
            k * i % m));
    return count;
}

inline std::vector<std::uint32_t> first_bin() {
    return counts_of(200.0, 0.1 * Eigen::Vector3d(-2.0, -1.0, 2.0) / 3.0, 1, 7);
}
inline std::vector<std::uint32_t> second_bin() {
    return counts_of(100.0, 0.15 * Eigen::Vector3d(1.0, 2.0, 2.0) / 3.0, 3, 5);
}

/// One survey, `dunlin`, on the pixels with |z| above a limit (-1: the full sky).
inline deviascope::Counts make_counts(const std::vector<std::vector<std::uint32_t>>& bins,
                                      double least_height = -1.0) {
    deviascope::Counts counts;
    counts.nside = 8;
    deviascope::SurveyCounts survey;
    survey.name = "dunlin";
    survey.footprints.push_back(
        synthetic::make_footprint(8, [&](const deviascope::Direction& n) {
            return std::abs(n.z()) > least_height ? 1.0 : 0.0;
        }));
    for (std::size_t b = 0; b < bins.size(); ++b) {
        survey.bins.push_back({b == 0 ? "faint" : "bright", 0, {}});
        for (const std::int64_t pixel : survey.footprints[0].pixel)
            survey.bins.back().count.push_back(bins[b][static_cast<std::size_t>(pixel)]);
    }
    counts.surveys.push_back(std::move(survey));
    return counts;
}

/// Weights held fixed, vectors under wide flat priors.
inline deviascope::ModelOptions make_model(const std::vector<double>& weights) {
    const deviascope::VectorPrior wide("wide", deviascope::UniformVectorPrior{1.0});
    deviascope::ModelOptions options;
    options.velocity = wide;
    deviascope::SurveyModel survey;
    const auto n = static_cast<Eigen::Index>(weights.size());
    survey.weights = {Eigen::Map<const Eigen::VectorXd>(weights.data(), n),
                      Eigen::MatrixXd::Zero(n, n)};
    survey.bins.resize(weights.size());
    survey.intrinsic = wide;
    options.surveys.push_back(survey);
    return options;
}

}  // namespace poisson_data
