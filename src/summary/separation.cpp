// SPDX-License-Identifier: GPL-2.0-or-later
#include "deviascope/summary/separation.h"

#include <Eigen/LU>
#include <Eigen/QR>
#include <algorithm>
#include <cmath>

#include "deviascope/core/error.h"
#include "deviascope/model/information.h"

namespace deviascope {
namespace {

/// A vector's free coordinates: the columns of `to_vector`, 3 x n_free.
Eigen::MatrixXd free_coordinates(const VectorPrior& prior) {
    if (const auto* along = std::get_if<AxisPrior>(&prior.kind())) return along->axis;
    return Eigen::MatrixXd::Identity(3, prior.n_coordinates());
}

/// Inverse of the prior's covariance in the free coordinates.
Eigen::MatrixXd prior_information(const VectorPrior& prior) {
    const Eigen::MatrixXd to_vector = free_coordinates(prior);
    const Eigen::MatrixXd covariance = to_vector.transpose() * prior.covariance() * to_vector;
    return covariance.inverse();
}

/// Which free coordinates a question involves, as a linear map to the row of parameters.
struct Coordinates {
    Eigen::MatrixXd to_parameters;  ///< n_parameters x n_coordinates
    std::vector<Eigen::Index> velocity, intrinsic, others;
    Eigen::MatrixXd weight_information;     ///< prior, n x n, zero but for weights
    Eigen::MatrixXd intrinsic_information;  ///< prior, n x n, zero but for intrinsic vectors
};

class CoordinateList {
  public:
    explicit CoordinateList(Eigen::Index n_parameters) : n_parameters_(n_parameters) {}

    /// Adds coordinates that span some parameters from `first`; returns their numbers.
    std::vector<Eigen::Index> add(Eigen::Index first, const Eigen::MatrixXd& map) {
        std::vector<Eigen::Index> numbers;
        for (Eigen::Index column = 0; column < map.cols(); ++column) {
            Eigen::VectorXd whole = Eigen::VectorXd::Zero(n_parameters_);
            whole.segment(first, map.rows()) = map.col(column);
            numbers.push_back(std::ssize(columns_));
            columns_.push_back(whole);
        }
        return numbers;
    }
    Eigen::MatrixXd map() const {
        Eigen::MatrixXd map(n_parameters_, std::ssize(columns_));
        for (Eigen::Index column = 0; column < map.cols(); ++column)
            map.col(column) = columns_[static_cast<std::size_t>(column)];
        return map;
    }

  private:
    Eigen::Index n_parameters_;
    std::vector<Eigen::VectorXd> columns_;
};

/// A prior's information and the coordinates it is about.
struct Block {
    std::vector<Eigen::Index> numbers;
    Eigen::MatrixXd information;
};

Eigen::MatrixXd spread(const std::vector<Block>& blocks, Eigen::Index n) {
    Eigen::MatrixXd whole = Eigen::MatrixXd::Zero(n, n);
    for (const Block& block : blocks)
        if (!block.numbers.empty()) whole(block.numbers, block.numbers) += block.information;
    return whole;
}

bool concerns(const BinTerm& term, int only_survey) {
    return only_survey < 0 || term.survey == static_cast<std::size_t>(only_survey);
}

/// Sampled weights of one survey under their joint prior.
Block add_weights(const ParameterSpace& space, std::size_t survey, CoordinateList& list) {
    const WeightPrior& prior = space.options().surveys[survey].weights;
    Block block;
    std::vector<Eigen::Index> sampled;
    for (const BinTerm& term : space.terms()) {
        const auto bin = static_cast<Eigen::Index>(term.bin);
        if (term.survey != survey || prior.covariance(bin, bin) <= 0.0) continue;
        sampled.push_back(bin);
        block.numbers.push_back(list.add(term.weight, Eigen::MatrixXd::Ones(1, 1)).front());
    }
    if (sampled.empty()) return block;
    const Eigen::MatrixXd covariance = prior.covariance(sampled, sampled);
    block.information = covariance.completeOrthogonalDecomposition().pseudoInverse();
    return block;
}

/// Free coordinates of one survey's terms, or of all where `only_survey` is negative.
Coordinates coordinates_of(const ParameterSpace& space, int only_survey) {
    CoordinateList list(space.n_parameters());
    Coordinates result;
    result.velocity =
        list.add(space.vectors()[0].first, free_coordinates(space.vector_prior(0)));
    std::vector<Block> weights, vectors;
    for (std::size_t v = 1; v < space.vectors().size(); ++v) {
        const Eigen::Index first = space.vectors()[v].first;
        const bool used =
            std::any_of(space.terms().begin(), space.terms().end(), [&](const BinTerm& term) {
                return term.intrinsic == first && concerns(term, only_survey);
            });
        if (!used || space.vector_prior(v).n_coordinates() == 0) continue;
        const auto numbers = list.add(first, free_coordinates(space.vector_prior(v)));
        vectors.push_back({numbers, prior_information(space.vector_prior(v))});
        result.intrinsic.insert(result.intrinsic.end(), numbers.begin(), numbers.end());
    }
    for (std::size_t survey = 0; survey < space.options().surveys.size(); ++survey) {
        if (only_survey >= 0 && survey != static_cast<std::size_t>(only_survey)) continue;
        weights.push_back(add_weights(space, survey, list));
        const auto& numbers = weights.back().numbers;
        result.others.insert(result.others.end(), numbers.begin(), numbers.end());
    }
    for (const BinTerm& term : space.terms())
        if (concerns(term, only_survey))
            result.others.push_back(
                list.add(term.monopole, Eigen::MatrixXd::Ones(1, 1)).front());
    result.to_parameters = list.map();
    const Eigen::Index n = result.to_parameters.cols();
    result.weight_information = spread(weights, n);
    result.intrinsic_information = spread(vectors, n);
    return result;
}

std::string verdict_of(std::optional<double> share) {
    if (!share) return "the velocity is fixed: nothing to separate";
    if (*share < 0.1) return "separated by the bins";
    if (*share < 0.5) return "partly separated: priors matter";
    return "not separated: the split between velocity and intrinsic dipole is set by the "
           "priors";
}

/// 1 - tr(I Sigma) / n_free, clipped to 0 … 1.
double prior_share(const Eigen::MatrixXd& information, const Eigen::MatrixXd& covariance) {
    const double from_counts = (information * covariance).trace();
    return std::clamp(1.0 - from_counts / static_cast<double>(information.rows()), 0.0, 1.0);
}

/// What the counts say of the velocity: all of it, and where the intrinsic prior helps.
struct VelocityInformation {
    Eigen::MatrixXd flat, with_intrinsic_prior;
};

VelocityInformation velocity_information(const Counts& counts,
                                         const ParameterSpace& space,
                                         const Eigen::VectorXd& mean,
                                         int only_survey) {
    const Coordinates coordinates = coordinates_of(space, only_survey);
    const Eigen::MatrixXd& map = coordinates.to_parameters;
    const Eigen::MatrixXd information =
        map.transpose() * expected_information(counts, space, mean, only_survey) * map +
        coordinates.weight_information;
    std::vector<Eigen::Index> rest = coordinates.intrinsic;
    rest.insert(rest.end(), coordinates.others.begin(), coordinates.others.end());
    return {
        eliminate(information, coordinates.velocity, rest),
        eliminate(information + coordinates.intrinsic_information, coordinates.velocity, rest)};
}

/// Spread of the weights over the sources of a survey, at the posterior means.
double weight_spread(const Counts& counts,
                     const ParameterSpace& space,
                     const Eigen::VectorXd& mean,
                     std::size_t survey) {
    double sources = 0.0, sum = 0.0, squares = 0.0;
    for (const BinTerm& term : space.terms()) {
        if (term.survey != survey) continue;
        const auto n = static_cast<double>(counts.surveys[survey].bins[term.bin].total());
        const double shift = mean[term.weight] - sum;  // running mean, stable for equal weights
        sources += n;
        if (sources == 0.0) continue;
        sum += shift * n / sources;
        squares += n * shift * (mean[term.weight] - sum);
    }
    return std::sqrt(squares / sources);
}

}  // namespace

Eigen::MatrixXd free_velocity_coordinates(const ParameterSpace& space) {
    return free_coordinates(space.vector_prior(0));
}

Separation separation_of(const Counts& counts,
                         const ParameterSpace& space,
                         const Eigen::VectorXd& mean,
                         const Eigen::MatrixXd& covariance) {
    const VectorPrior& prior = space.vector_prior(0);
    const bool is_free = prior.n_coordinates() > 0;
    ensure(covariance.rows() == prior.n_coordinates(),
           "the covariance is that of the velocity's free coordinates");
    Separation separation;
    for (std::size_t survey = 0; survey < counts.surveys.size(); ++survey) {
        SeparationEntry entry;
        entry.weight_spread = weight_spread(counts, space, mean, survey);
        if (is_free) {
            const VelocityInformation alone =
                velocity_information(counts, space, mean, static_cast<int>(survey));
            const Eigen::MatrixXd with_priors =
                alone.with_intrinsic_prior + prior_information(prior);
            entry.velocity_prior_share = prior_share(alone.flat, with_priors.inverse());
        }
        entry.verdict = verdict_of(entry.velocity_prior_share);
        separation.surveys.push_back(entry);
    }
    if (is_free)
        separation.joint.velocity_prior_share =
            prior_share(velocity_information(counts, space, mean, -1).flat, covariance);
    separation.joint.verdict = verdict_of(separation.joint.velocity_prior_share);
    return separation;
}

}  // namespace deviascope
