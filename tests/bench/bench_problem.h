// SPDX-License-Identifier: GPL-2.0-or-later
// The reference problem of the benchmarks: three invented surveys, 24 bins, 36 coordinates,
// with dipoles of the size that catalogues show.
#pragma once

#include <Eigen/Core>
#include <ctime>
#include <string>
#include <vector>

#include "reference_problem.h"
#include "synthetic_counts.h"

namespace bench {

inline deviascope::Counts make_counts(int nside, double sources) {
    const std::vector<Eigen::Vector3d> dipoles = {
        {0.008, -0.004, 0.003}, {-0.002, 0.006, 0.004}, {0.001, 0.001, -0.009}};
    std::vector<synthetic::Survey> surveys;
    for (std::size_t s = 0; s < reference_problem::n_surveys; ++s) {
        synthetic::Survey survey;
        survey.name = std::string("survey-") + static_cast<char>('a' + s);
        survey.intrinsic = dipoles[s];
        survey.exposure = [s](const deviascope::Direction& n) {
            return reference_problem::exposure(s, n);
        };
        for (std::size_t b = 0; b < reference_problem::n_bins; ++b)
            survey.bins.push_back({"bin-" + std::to_string(b),
                                   sources / 24.0,
                                   reference_problem::weight_mean(s, b)});
        surveys.push_back(survey);
    }
    return synthetic::make_counts(nside, {0.0012, -0.0015, 0.001}, surveys, 17);
}

inline deviascope::ModelOptions make_model(deviascope::Engine engine) {
    deviascope::ModelOptions model = reference_problem::make_model();
    model.engine.engine = engine;
    return model;
}

inline double cpu_seconds() {
    return static_cast<double>(std::clock()) / CLOCKS_PER_SEC;
}

inline double median(std::vector<double> values) {
    std::sort(values.begin(), values.end());
    return values[values.size() / 2];
}

}  // namespace bench
