// SPDX-License-Identifier: GPL-2.0-or-later
// The three invented surveys with 24 bins of tests/reference/numpy_posterior.
#pragma once

#include <Eigen/Core>
#include <cmath>
#include <cstdint>
#include <string>

#include "deviascope/counts/count_map.h"
#include "deviascope/model/model_options.h"
#include "synthetic_counts.h"

namespace reference_problem {

inline constexpr int nside = 64;
inline constexpr std::size_t n_surveys = 3, n_bins = 8;

inline double exposure(std::size_t survey, const deviascope::Direction& n) {
    if (survey == 0) return std::abs(n.z()) > 0.26 ? 1.0 : 0.0;
    if (survey == 1) return n.z() > -0.6 ? 1.0 - 0.25 * (n.x() * n.x()) : 0.0;
    return 1.0;
}

inline double weight_mean(std::size_t survey, std::size_t bin) {
    return 2.0 + 0.75 * static_cast<double>(bin) + 0.25 * static_cast<double>(survey);
}

inline std::uint32_t count_at(std::size_t survey,
                              std::size_t bin,
                              std::int64_t pixel,
                              const deviascope::Direction& n) {
    const auto s = static_cast<std::int64_t>(survey), b = static_cast<std::int64_t>(bin);
    const double a = 6.0 + 2.0 * static_cast<double>(bin) + static_cast<double>(survey);
    const double d = 0.003 * static_cast<double>(bin + 1);
    const double slope = 1.0 + d * n.x() - 0.5 * d * n.y() + 0.01 * n.z();
    const double made =
        std::floor(a * slope) + static_cast<double>(((2 * s + 3) * pixel + 5 * b) % (7 + b));
    return static_cast<std::uint32_t>(made * std::nearbyint(exposure(survey, n) + 0.2));
}

inline deviascope::Counts make_counts() {
    const deviascope::Pixelisation grid(nside);
    deviascope::Counts counts;
    counts.nside = nside;
    for (std::size_t s = 0; s < n_surveys; ++s) {
        deviascope::SurveyCounts survey;
        survey.name = std::string("survey-") + static_cast<char>('a' + s);
        survey.footprints.push_back(synthetic::make_footprint(
            nside, [s](const deviascope::Direction& n) { return exposure(s, n); }));
        for (std::size_t b = 0; b < n_bins; ++b) {
            deviascope::BinCounts bin{"bin-" + std::to_string(b), 0, {}};
            for (const std::int64_t pixel : survey.footprints[0].pixel)
                bin.count.push_back(count_at(s, b, pixel, grid.centre(pixel)));
            survey.bins.push_back(std::move(bin));
        }
        counts.surveys.push_back(std::move(survey));
    }
    return counts;
}

inline deviascope::ModelOptions make_model() {
    deviascope::ModelOptions options;
    options.velocity = deviascope::VectorPrior("free", deviascope::UniformVectorPrior{0.05});
    for (std::size_t s = 0; s < n_surveys; ++s) {
        deviascope::SurveyModel survey;
        survey.weights.mean.resize(n_bins);
        for (std::size_t b = 0; b < n_bins; ++b)
            survey.weights.mean[static_cast<Eigen::Index>(b)] = weight_mean(s, b);
        survey.weights.covariance = 0.01 * Eigen::MatrixXd::Identity(n_bins, n_bins);
        survey.bins.resize(n_bins);
        survey.intrinsic = deviascope::VectorPrior(
            "modest",
            deviascope::GaussianPrior{Eigen::Vector3d::Zero(),
                                      4e-4 * Eigen::Matrix3d::Identity()});
        options.surveys.push_back(std::move(survey));
    }
    return options;
}

}  // namespace reference_problem
