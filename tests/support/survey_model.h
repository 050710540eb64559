// SPDX-License-Identifier: GPL-2.0-or-later
// The model that goes with invented surveys.
#pragma once

#include <Eigen/Core>
#include <utility>
#include <vector>

#include "deviascope/model/model_options.h"

namespace deviascope::test {

/// One prior for the velocity, one for every intrinsic vector, weights Gaussian about the
/// truth.
/// @param surveys  each with `bins` of a weight, weight_sd (0: not sampled), bias_ratio and
///                 dispersion
template <class Survey>
ModelOptions model_of_surveys(const std::vector<Survey>& surveys,
                              const VectorPrior& velocity,
                              const VectorPrior& intrinsic) {
    ModelOptions options;
    options.velocity = velocity;
    options.intrinsic = intrinsic;
    for (const Survey& survey : surveys) {
        SurveyModel model;
        const auto n = static_cast<Eigen::Index>(survey.bins.size());
        model.weights.mean.resize(n);
        model.weights.covariance = Eigen::MatrixXd::Zero(n, n);
        for (Eigen::Index b = 0; b < n; ++b) {
            const auto& bin = survey.bins[static_cast<std::size_t>(b)];
            model.weights.mean[b] = bin.weight;
            model.weights.covariance(b, b) = bin.weight_sd * bin.weight_sd;
            model.bins.push_back({bin.bias_ratio, bin.dispersion});
        }
        model.intrinsic = intrinsic;
        options.surveys.push_back(std::move(model));
    }
    return options;
}

}  // namespace deviascope::test
