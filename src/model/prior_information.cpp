// SPDX-License-Identifier: GPL-2.0-or-later
#include "model/prior_information.h"

#include <Eigen/LU>

namespace deviascope {
namespace {

struct VectorInformation {
    Eigen::VectorXd gradient;
    Eigen::MatrixXd information;
};

/// Of one vector, at 0, in its own free parameters (3, or 1 along an axis).
VectorInformation of_vector(const VectorPrior& prior) {
    if (const auto* along = std::get_if<AxisPrior>(&prior.kind())) {
        const double information = 12.0 / (along->max * along->max);
        return {Eigen::VectorXd::Constant(1, 0.5 * along->max * information),
                Eigen::MatrixXd::Constant(1, 1, information)};
    }
    const Eigen::Matrix3d information = prior.covariance().inverse();
    Eigen::Vector3d gradient = Eigen::Vector3d::Zero();
    if (const auto* gaussian = std::get_if<GaussianPrior>(&prior.kind()))
        gradient = information * gaussian->mean;
    return {gradient, information};
}

void add_monopoles(const ParameterSpace& space,
                   const Eigen::Ref<const Eigen::VectorXd>& row,
                   PriorInformation& all) {
    const MonopolePrior& prior = space.options().monopole;
    if (!prior.sampled) return;
    const Eigen::Index n = std::ssize(space.terms());
    const Eigen::VectorXd expected = prior.rate * row.tail(n);
    all.gradient.tail(n).array() += prior.shape - expected.array();
    all.information.bottomRightCorner(n, n).diagonal() += expected;
}

}  // namespace

Eigen::MatrixXd free_directions(const ParameterSpace& space) {
    Eigen::MatrixXd directions =
        Eigen::MatrixXd::Zero(space.n_parameters(), space.n_coordinates());
    for (std::size_t v = 0; v < space.vectors().size(); ++v) {
        const VectorPrior& prior = space.vector_prior(v);
        const ParameterSpace::VectorPlace& place = space.vector_places()[v];
        auto block =
            directions.block(place.parameter, place.coordinate, 3, prior.n_coordinates());
        if (const auto* along = std::get_if<AxisPrior>(&prior.kind()))
            block = along->axis;
        else
            block.setIdentity();
    }
    for (const ParameterSpace::WeightPlace& place : space.weight_places())
        for (Eigen::Index k = 0; k < std::ssize(place.sampled); ++k)
            directions(place.parameter + place.sampled[static_cast<std::size_t>(k)],
                       place.coordinate + k) = 1.0;
    if (space.options().monopole.sampled) {
        const Eigen::Index n = std::ssize(space.terms());
        directions.bottomRightCorner(n, n).setIdentity();
    }
    return directions;
}

PriorInformation prior_information(const ParameterSpace& space,
                                   const Eigen::Ref<const Eigen::VectorXd>& row) {
    const Eigen::Index n = space.n_coordinates();
    PriorInformation all{Eigen::VectorXd::Zero(n), Eigen::MatrixXd::Zero(n, n)};
    for (std::size_t v = 0; v < space.vectors().size(); ++v) {
        const VectorPrior& prior = space.vector_prior(v);
        if (prior.n_coordinates() == 0) continue;
        const Eigen::Index first = space.vector_places()[v].coordinate;
        const VectorInformation one = of_vector(prior);
        all.gradient.segment(first, one.gradient.size()) = one.gradient;
        all.information.block(first, first, one.gradient.size(), one.gradient.size()) =
            one.information;
    }
    for (const ParameterSpace::WeightPlace& place : space.weight_places()) {
        const Eigen::MatrixXd& factor = place.precision_factor;
        all.information.block(
            place.coordinate, place.coordinate, factor.rows(), factor.rows()) =
            factor.transpose() * factor;
    }
    add_monopoles(space, row, all);
    return all;
}

}  // namespace deviascope
