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
    /// Where a vector stands in a row of parameters and among the coordinates.
    struct VectorPlace {
        Eigen::Index parameter = 0, coordinate = 0;
        double largest_ratio = 1.0;  ///< largest |r| of the bins that feel it, at least 1
    };
    /// The sampled weights of a survey and their Gaussian.
    struct WeightPlace {
        Eigen::Index parameter = 0, coordinate = 0;  ///< of the first weight, first sampled one
        std::vector<Eigen::Index> sampled;           ///< bins
        Eigen::VectorXd mean;                        ///< of the sampled ones
        Eigen::MatrixXd precision_factor;            ///< inverse Cholesky factor L^-1, lower
        double log_normalisation = 0.0;
    };

    /// Errors: UsageError with all of problems_of(options, counts).
    ParameterSpace(const Counts& counts, const ModelOptions& options);

    const std::vector<Parameter>& parameters() const { return parameters_; }
    const std::vector<VectorParameter>& vectors() const { return vectors_; }
    const std::vector<BinTerm>& terms() const { return terms_; }
    Eigen::Index n_parameters() const { return std::ssize(parameters_); }
    Eigen::Index n_coordinates() const { return n_coordinates_; }
    const ModelOptions& options() const { return options_; }
    const std::vector<VectorPlace>& vector_places() const { return vector_places_; }
    const std::vector<WeightPlace>& weight_places() const { return weight_places_; }
    /// Prior of vector `v` (0: velocity).
    const VectorPrior& vector_prior(std::size_t v) const;

    /// Parameters of one walker; redrawn monopoles NaN.
    void to_parameters(const Eigen::Ref<const Eigen::VectorXd>& coordinates,
                       Eigen::Ref<Eigen::VectorXd> parameters) const;
    /// Coordinates of a row; redrawn monopoles are ignored.
    Eigen::VectorXd to_coordinates(const Eigen::Ref<const Eigen::VectorXd>& parameters) const;

    /// True where |beta| < 1 and, for every bin, |D| < 1 and |r D| < 1.
    bool is_inside_walls(const Eigen::Ref<const Eigen::VectorXd>& parameters) const;

    /// Normalised log prior density in the coordinates; -inf outside. A sampled monopole with
    /// an improper prior contributes the unnormalised Gamma density of ln M, M^a exp(-b M).
    double log_prior(const Eigen::Ref<const Eigen::VectorXd>& coordinates) const;

  private:
    void add_vector(VectorParameter vector,
                    const std::string& meaning,
                    const std::string& unit,
                    const VectorPrior& prior);
    void add_vectors(const Counts& counts);
    void add_weights(const Counts& counts);
    void add_monopoles(const Counts& counts);
    void add_terms(const Counts& counts);
    double log_monopole_prior(const Eigen::Ref<const Eigen::VectorXd>& coordinates) const;

    ModelOptions options_;
    std::vector<Parameter> parameters_;
    std::vector<VectorParameter> vectors_;
    std::vector<BinTerm> terms_;
    Eigen::Index n_coordinates_ = 0;
    std::vector<VectorPlace> vector_places_;  ///< one a vector
    std::vector<WeightPlace> weight_places_;  ///< one a survey
    Eigen::Index monopole_parameter_ = 0;     ///< of the first monopole
    Eigen::Index monopole_coordinate_ = 0;    ///< likewise, where they are sampled
};

}  // namespace deviascope
