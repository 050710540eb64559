// SPDX-License-Identifier: GPL-2.0-or-later
// Count maps of invented surveys, drawn from the model itself with a fixed seed.
#pragma once

#include <Eigen/Core>
#include <boost/random/poisson_distribution.hpp>
#include <cmath>
#include <functional>
#include <string>
#include <utility>
#include <vector>

#include "deviascope/core/random.h"
#include "deviascope/counts/count_map.h"
#include "deviascope/sky/pixelisation.h"
#include "survey_model.h"

namespace synthetic {

/// A bin: its expected number of sources, and what the model needs to know of it.
struct Bin {
    std::string name;
    double sources = 1e5;
    double weight = 3.75;
    double weight_sd = 0.0;  ///< of the prior; 0: not sampled
    double bias_ratio = 1.0;
    double dispersion = 1.0;
};

/// A survey: exposure 0 … 1 as a function of the pixel centre (0: not kept), the same for all
/// bins.
struct Survey {
    std::string name;
    std::vector<Bin> bins;
    Eigen::Vector3d intrinsic = Eigen::Vector3d::Zero();
    std::function<double(const deviascope::Direction&)> exposure =
        [](const deviascope::Direction&) { return 1.0; };
};

inline deviascope::Footprint make_footprint(
    int nside, const std::function<double(const deviascope::Direction&)>& exposure) {
    const deviascope::Pixelisation grid(nside);
    deviascope::Footprint footprint;
    for (std::int64_t pixel = 0; pixel < grid.n_pixels(); ++pixel) {
        const double value = exposure(grid.centre(pixel));
        if (value <= 0.0) continue;
        footprint.pixel.push_back(pixel);
        footprint.exposure.push_back(value);
    }
    return footprint;
}

/// w [gamma (1 - beta.n)]^-B (1 + r D.n) of each kept pixel.
inline std::vector<double> relative_expectation(const deviascope::Footprint& footprint,
                                                int nside,
                                                const Eigen::Vector3d& velocity,
                                                const Eigen::Vector3d& dipole,
                                                double weight) {
    const deviascope::Pixelisation grid(nside);
    const double gamma = 1.0 / std::sqrt(1.0 - velocity.squaredNorm());
    std::vector<double> expected(footprint.pixel.size());
    for (std::size_t p = 0; p < expected.size(); ++p) {
        const deviascope::Direction n = grid.centre(footprint.pixel[p]);
        expected[p] = footprint.exposure[p] *
                      std::pow(gamma * (1.0 - velocity.dot(n)), -weight) *
                      (1.0 + dipole.dot(n));
    }
    return expected;
}

inline std::uint32_t draw_poisson(deviascope::Stream& stream, double mean) {
    boost::random::poisson_distribution<std::int64_t, double> poisson(mean);
    return static_cast<std::uint32_t>(poisson(stream));
}

/// Poisson counts; pixel p of bin b of survey s uses the stream (seed, test; s, b, p).
inline deviascope::Counts make_counts(int nside,
                                      const Eigen::Vector3d& velocity,
                                      const std::vector<Survey>& surveys,
                                      std::uint64_t seed) {
    deviascope::Counts counts;
    counts.nside = nside;
    for (std::size_t s = 0; s < surveys.size(); ++s) {
        deviascope::SurveyCounts survey;
        survey.name = surveys[s].name;
        survey.footprints.push_back(make_footprint(nside, surveys[s].exposure));
        for (std::size_t b = 0; b < surveys[s].bins.size(); ++b) {
            const Bin& bin = surveys[s].bins[b];
            std::vector<double> expected =
                relative_expectation(survey.footprints[0],
                                     nside,
                                     velocity,
                                     bin.bias_ratio * surveys[s].intrinsic,
                                     bin.weight);
            double sum = 0.0;
            for (const double value : expected) sum += value;
            deviascope::BinCounts made{bin.name, 0, {}};
            for (std::size_t p = 0; p < expected.size(); ++p) {
                const double mean = bin.sources * expected[p] / sum;
                deviascope::Stream stream(seed, deviascope::Purpose::test, s, b, p);
                made.count.push_back(mean > 0.0 ? draw_poisson(stream, mean) : 0);
            }
            survey.bins.push_back(std::move(made));
        }
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

}  // namespace synthetic
