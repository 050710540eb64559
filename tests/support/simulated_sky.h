// SPDX-License-Identifier: GPL-2.0-or-later
#pragma once

#include <Eigen/Core>
#include <boost/random/gamma_distribution.hpp>
#include <boost/random/poisson_distribution.hpp>
#include <cmath>
#include <string>
#include <vector>

#include "deviascope/core/random.h"
#include "deviascope/counts/count_map.h"
#include "deviascope/model/model_options.h"

namespace deviascope::test {

/// The parameters of a sky, by survey and bin.
struct SkyTruth {
    Eigen::Vector3d velocity = Eigen::Vector3d::Zero();
    std::vector<Eigen::Vector3d> intrinsic;  ///< one a survey
    std::vector<Eigen::VectorXd> weight;     ///< one a survey: its bins
    std::vector<Eigen::VectorXd> monopole;   ///< likewise, per steradian
};

/// Draws the truth from the priors of a model. Weights must have a diagonal covariance,
/// monopoles a proper prior.
inline SkyTruth draw_truth(const ModelOptions& model, Stream& stream) {
    SkyTruth truth;
    truth.velocity = model.velocity.draw(stream);
    for (const SurveyModel& survey : model.surveys) {
        truth.intrinsic.push_back(survey.intrinsic.draw(stream));
        const Eigen::Index n_bins = survey.weights.mean.size();
        Eigen::VectorXd weight(n_bins);
        Eigen::VectorXd monopole(n_bins);
        for (Eigen::Index bin = 0; bin < n_bins; ++bin) {
            const double sd = std::sqrt(survey.weights.covariance(bin, bin));
            weight[bin] = survey.weights.mean[bin] + sd * normal(stream);
            boost::random::gamma_distribution<double> gamma(model.monopole.shape,
                                                            1.0 / model.monopole.rate);
            monopole[bin] = gamma(stream);
        }
        truth.weight.push_back(weight);
        truth.monopole.push_back(monopole);
    }
    return truth;
}

/// Poisson counts on the full sky given the truth: the model's formula written out plainly,
/// with exposure 1 everywhere. Surveys are named s0, s1 …, their bins b0, b1 ….
inline Counts simulate_sky(const SkyTruth& truth, int nside, Stream& stream) {
    Counts counts;
    counts.nside = nside;
    const Pixelisation grid(nside);
    const double gamma = 1.0 / std::sqrt(1.0 - truth.velocity.squaredNorm());
    for (std::size_t s = 0; s < truth.weight.size(); ++s) {
        SurveyCounts survey;
        survey.name = "s" + std::to_string(s);
        Footprint all;
        for (std::int64_t pixel = 0; pixel < grid.n_pixels(); ++pixel) {
            all.pixel.push_back(pixel);
            all.exposure.push_back(1.0);
        }
        for (Eigen::Index b = 0; b < truth.weight[s].size(); ++b) {
            BinCounts bin;
            bin.name = "b" + std::to_string(b);
            for (std::int64_t pixel = 0; pixel < grid.n_pixels(); ++pixel) {
                const Direction n = grid.centre(pixel);
                const double kinematic =
                    std::pow(gamma * (1.0 - truth.velocity.dot(n)), -truth.weight[s][b]);
                const double mean = grid.solid_angle() * truth.monopole[s][b] * kinematic *
                                    (1.0 + truth.intrinsic[s].dot(n));
                boost::random::poisson_distribution<std::uint32_t, double> poisson(mean);
                bin.count.push_back(poisson(stream));
            }
            survey.bins.push_back(std::move(bin));
        }
        survey.footprints.push_back(std::move(all));
        counts.surveys.push_back(std::move(survey));
    }
    return counts;
}

}  // namespace deviascope::test
