// SPDX-License-Identifier: GPL-2.0-or-later
// Count maps without noise: the same number of sources in every pixel of the whole sky.
#pragma once

#include <numeric>
#include <string>
#include <utility>
#include <vector>

#include "deviascope/counts/count_map.h"
#include "deviascope/sky/pixelisation.h"
#include "survey_model.h"

namespace even {

/// A bin: sources in each pixel, and its weight's prior.
struct Bin {
    std::string name;
    std::uint32_t sources_per_pixel;
    double weight;
    double weight_sd = 0.0;
    double bias_ratio = 1.0, dispersion = 1.0;
};

struct Survey {
    std::string name;
    std::vector<Bin> bins;
};

inline deviascope::Counts counts_of(int nside, const std::vector<Survey>& surveys) {
    deviascope::Counts counts;
    counts.nside = nside;
    const auto n = static_cast<std::size_t>(deviascope::Pixelisation(nside).n_pixels());
    for (const Survey& given : surveys) {
        deviascope::SurveyCounts survey;
        survey.name = given.name;
        deviascope::Footprint footprint{std::vector<std::int64_t>(n),
                                        std::vector<double>(n, 1.0)};
        std::iota(footprint.pixel.begin(), footprint.pixel.end(), 0);
        survey.footprints.push_back(std::move(footprint));
        for (const Bin& bin : given.bins)
            survey.bins.push_back(
                {bin.name, 0, std::vector<std::uint32_t>(n, bin.sources_per_pixel)});
        counts.surveys.push_back(std::move(survey));
    }
    return counts;
}

/// The model that goes with such counts.
inline deviascope::ModelOptions make_model(const std::vector<Survey>& surveys,
                                           const deviascope::VectorPrior& velocity,
                                           const deviascope::VectorPrior& intrinsic) {
    return deviascope::test::model_of_surveys(surveys, velocity, intrinsic);
}

}  // namespace even
