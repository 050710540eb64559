// SPDX-License-Identifier: GPL-2.0-or-later
// counts -> MODEL -> ensemble
#pragma once

#include <Eigen/Core>
#include <string>
#include <vector>

#include "deviascope/core/parameter.h"
#include "deviascope/counts/count_map.h"
#include "deviascope/model/model_options.h"

namespace deviascope {

/// One term of the likelihood: a bin, and where its parameters stand in a row of the chain.
struct BinTerm {
    std::size_t survey = 0, bin = 0;
    Eigen::Index intrinsic = 0;  ///< index of the x component of its intrinsic vector
    Eigen::Index weight = 0;     ///< index of its kinematic weight
    Eigen::Index monopole = 0;   ///< index of its monopole
    double bias_ratio = 1.0;
    double dispersion = 1.0;
};

/// The parameters of a job (a row of the chain) and the coordinates that the sampler moves.
///
/// Order of parameters: velocity x y z, intrinsic vectors in job order (or `intrinsic.all`),
/// weights, monopoles; constants too. Coordinates follow the same order, without what is not
/// sampled; a sampled monopole is ln M; the weights of a survey are moved as they are.
class ParameterSpace {
  public:
    ParameterSpace(const Counts& counts, const ModelOptions& options);

    const std::vector<Parameter>& parameters() const { return parameters_; }
    const std::vector<VectorParameter>& vectors() const { return vectors_; }
    const std::vector<BinTerm>& terms() const { return terms_; }
    Eigen::Index n_parameters() const { return std::ssize(parameters_); }
    Eigen::Index n_coordinates() const { return n_coordinates_; }
    const ModelOptions& options() const { return options_; }
    /// Prior of vector `v` (0: velocity).
    const VectorPrior& vector_prior(std::size_t v) const;

    /// Parameters of one walker; redrawn monopoles NaN.
    void to_parameters(const Eigen::Ref<const Eigen::VectorXd>& coordinates,
                       Eigen::Ref<Eigen::VectorXd> parameters) const;
    /// Coordinates of a row; redrawn monopoles are ignored.
    Eigen::VectorXd to_coordinates(const Eigen::Ref<const Eigen::VectorXd>& parameters) const;

    /// Normalised log prior density in the coordinates; -inf outside. A sampled monopole with
    /// an improper prior contributes the unnormalised Gamma density of ln M, M^a exp(-b M).
    double log_prior(const Eigen::Ref<const Eigen::VectorXd>& coordinates) const;

  private:
    ModelOptions options_;
    std::vector<Parameter> parameters_;
    std::vector<VectorParameter> vectors_;
    std::vector<BinTerm> terms_;
    Eigen::Index n_coordinates_ = 0;
    // further private members as needed
};

}  // namespace deviascope
