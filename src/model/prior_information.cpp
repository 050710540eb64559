// SPDX-License-Identifier: GPL-2.0-or-later
#include "model/prior_information.h"

#include <Eigen/LU>

namespace deviascope {
namespace {

/// Adds a Gaussian of given offset from its mean.
void add_gaussian(const Eigen::MatrixXd& information,
                  const Eigen::VectorXd& offset,
                  Eigen::Index first,
                  PriorExpansion& all) {
    const Eigen::Index n = offset.size();
    const Eigen::VectorXd pull = information * offset;
    all.value -= 0.5 * offset.dot(pull);
    all.gradient.segment(first, n) -= pull;
    all.information.block(first, first, n, n) += information;
}

void add_monopoles(const FreeParameters& parameters,
                   const Eigen::Ref<const Eigen::VectorXd>& free,
                   PriorExpansion& all) {
    const ParameterSpace& space = parameters.space();
    const MonopolePrior& prior = space.options().monopole;
    if (!prior.sampled) return;
    const Eigen::Index n = std::ssize(space.terms());
    const Eigen::VectorXd expected = prior.rate * parameters.row_at(free).tail(n);
    all.value += prior.shape * free.tail(n).sum() - expected.sum();
    all.gradient.tail(n).array() += prior.shape - expected.array();
    all.information.bottomRightCorner(n, n).diagonal() += expected;
}

}  // namespace

PriorExpansion prior_expansion(const FreeParameters& parameters,
                               const Eigen::Ref<const Eigen::VectorXd>& free) {
    const ParameterSpace& space = parameters.space();
    const Eigen::Index n = parameters.size();
    PriorExpansion all{0.0, Eigen::VectorXd::Zero(n), Eigen::MatrixXd::Zero(n, n)};
    for (std::size_t v = 0; v < space.vectors().size(); ++v)
        if (const auto* gaussian = std::get_if<GaussianPrior>(&space.vector_prior(v).kind())) {
            const Eigen::Index first = parameters.first_of(v);
            add_gaussian(gaussian->covariance.inverse(),
                         free.segment<3>(first) - gaussian->mean,
                         first,
                         all);
        }
    for (const ParameterSpace::WeightPlace& place : space.weight_places()) {
        const Eigen::MatrixXd& factor = place.precision_factor;
        add_gaussian(factor.transpose() * factor,
                     free.segment(place.coordinate, factor.rows()),
                     place.coordinate,
                     all);
    }
    add_monopoles(parameters, free, all);
    return all;
}

Eigen::MatrixXd bounded_information(const FreeParameters& parameters) {
    const ParameterSpace& space = parameters.space();
    Eigen::MatrixXd all = Eigen::MatrixXd::Zero(parameters.size(), parameters.size());
    for (std::size_t v = 0; v < space.vectors().size(); ++v) {
        const VectorPrior& prior = space.vector_prior(v);
        const Eigen::Index first = parameters.first_of(v);
        if (const auto* along = std::get_if<AxisPrior>(&prior.kind()))
            all(first, first) = 12.0 / (along->max * along->max);
        else if (parameters.size_of(v) == 3 &&
                 !std::holds_alternative<GaussianPrior>(prior.kind()))
            all.block<3, 3>(first, first) = prior.covariance().inverse();
    }
    return all;
}

}  // namespace deviascope
