// SPDX-License-Identifier: GPL-2.0-or-later
// counts -> MODEL -> ensemble
#pragma once

#include <Eigen/Core>
#include <string>
#include <vector>

#include "deviascope/core/error.h"
#include "deviascope/model/vector_prior.h"

namespace deviascope {

struct Counts;

/// Kinematic weights of a survey's bins: a joint Gaussian prior. A zero on the diagonal of the
/// covariance (its row and column zero too) is a weight that is not sampled; over the others it
/// must be positive definite (the weights themselves are the sampler's coordinates, so that no
/// combination of them may be without width).
struct WeightPrior {
    Eigen::VectorXd mean;        ///< n_bins
    Eigen::MatrixXd covariance;  ///< n_bins x n_bins, symmetric

    /// Indices of the bins whose weight is sampled.
    std::vector<Eigen::Index> sampled() const;
};

/// Monopoles, sources per steradian: Gamma(shape, rate) for each; (0, 0) is log-uniform (1/M),
/// (1, 0) uniform. Shape and rate are 0 or more.
struct MonopolePrior {
    double shape = 0.0;
    double rate = 0.0;
    bool sampled = false;  ///< sample ln M instead of integrating it out
    bool is_improper() const { return shape <= 0.0 || rate <= 0.0; }
};

/// What the model needs to know of one bin besides its counts.
struct BinModel {
    double bias_ratio = 1.0;  ///< r: the bin feels r times the survey's intrinsic dipole
    double dispersion = 1.0;  ///< phi > 0: ln L of the bin is divided by it
};

struct SurveyModel {
    WeightPrior weights;
    std::vector<BinModel> bins;  ///< in the order of the counts
    VectorPrior intrinsic{"no-intrinsic",
                          FixedPrior{}};  ///< idle where the intrinsic vector is shared
};

/// Which engine answers for the likelihood.
enum class Engine {
    automatic,  ///< the moment engine where its bound allows, else the pixel engine
    moment,  ///< likewise, but a job that asks for it is warned where the pixel engine had to
    pixel    ///< the pixel engine always
};

struct EngineOptions {
    Engine engine = Engine::automatic;
    /// Largest error of ln L by the truncation of the moment engine's series; above 0.
    /// 1e-6: a ten-thousandth of a per cent in a probability.
    double tolerance = 1e-6;
};

struct ModelOptions {
    VectorPrior velocity{"no-motion", FixedPrior{}};
    bool intrinsic_shared = false;
    VectorPrior intrinsic{"no-intrinsic", FixedPrior{}};  ///< where shared
    std::vector<SurveyModel> surveys;                     ///< in the order of the counts
    MonopolePrior monopole;
    EngineOptions engine;
};

/// Every reason why these options cannot go with these counts: numbers of surveys and bins,
/// sizes of weight priors, ranges of the numbers.
std::vector<Message> problems_of(const ModelOptions& options, const Counts& counts);

}  // namespace deviascope
