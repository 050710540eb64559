// SPDX-License-Identifier: GPL-2.0-or-later
#include "model/log_posterior.h"

#include <array>
#include <limits>

namespace deviascope {
namespace {

bool is_bounded(const VectorPrior& prior) {
    return prior.n_coordinates() > 0 && !std::holds_alternative<GaussianPrior>(prior.kind());
}

}  // namespace

LogPosterior::LogPosterior(const Counts& counts,
                           const FreeParameters& parameters,
                           const Engines& engines)
    : counts_(counts),
      parameters_(parameters),
      engines_(engines),
      totals_(totals_of(counts, parameters.space())) {
    for (std::size_t v = 0; v < parameters.space().vectors().size(); ++v)
        stiffness_.push_back(1e4 / (parameters.furthest(v) * parameters.furthest(v)));
}

std::vector<LogPosterior::Beyond> LogPosterior::beyond(
    const Eigen::Ref<const Eigen::VectorXd>& free) const {
    std::vector<Beyond> all;
    for (std::size_t v = 0; v < stiffness_.size(); ++v) {
        if (!is_bounded(parameters_.space().vector_prior(v))) continue;
        const Eigen::Index first = parameters_.first_of(v), n = parameters_.size_of(v);
        const Eigen::VectorXd vector = free.segment(first, n);
        const bool is_negative = n == 1 && vector[0] < 0.0;
        const double bound = is_negative ? 0.0 : parameters_.furthest(v);
        const double distance = vector.norm() - bound;
        if (distance <= 0.0) continue;
        Eigen::VectorXd outward = Eigen::VectorXd::Zero(free.size());
        outward.segment(first, n) = vector.normalized();
        all.push_back({v, distance, bound, std::move(outward)});
    }
    return all;
}

void LogPosterior::add_springs(const Eigen::Ref<const Eigen::VectorXd>& free,
                               Expansion& all) const {
    for (const Beyond& one : beyond(free)) {
        const double stiffness = stiffness_[one.vector];
        const double pull = stiffness * one.distance;
        all.value -= 0.5 * pull * one.distance;
        all.gradient -= pull * one.outward;
        all.curvature += stiffness * one.outward * one.outward.transpose();
        // Moving along the bound turns the direction of the pull.
        const Eigen::Index first = parameters_.first_of(one.vector);
        const Eigen::Index n = parameters_.size_of(one.vector);
        const Eigen::VectorXd outward = one.outward.segment(first, n);
        all.curvature.block(first, first, n, n) +=
            pull / (one.bound + one.distance) *
            (Eigen::MatrixXd::Identity(n, n) - outward * outward.transpose());
    }
}

void LogPosterior::add_counts(const Eigen::Ref<const Eigen::VectorXd>& free,
                              Expansion& all) const {
    const ParameterSpace& space = parameters_.space();
    const Eigen::VectorXd row = parameters_.row_at(free);
    Eigen::VectorXd gradient = Eigen::VectorXd::Zero(row.size());
    Eigen::MatrixXd hessian = Eigen::MatrixXd::Zero(row.size(), row.size());
    for (std::size_t t = 0; t < space.terms().size(); ++t) {
        const BinTerm& term = space.terms()[t];
        const BinLogLikelihood bin = log_likelihood_of(engines_.expansion(counts_, t, row),
                                                       totals_[t],
                                                       space.options().monopole,
                                                       row[term.monopole]);
        const Eigen::Index d = term.intrinsic;
        const std::array<Eigen::Index, n_bin_variables + 1> place = {
            0, 1, 2, d, d + 1, d + 2, term.weight, term.monopole};
        all.value += bin.value;
        gradient(place) += bin.gradient;
        hessian(place, place) += bin.hessian;
    }
    all.gradient += parameters_.directions().transpose() * gradient;
    all.curvature -= parameters_.directions().transpose() * hessian * parameters_.directions();
}

LogPosterior::Expansion LogPosterior::at(const Eigen::Ref<const Eigen::VectorXd>& free) const {
    PriorExpansion prior = prior_expansion(parameters_, free);
    Expansion all{prior.value, std::move(prior.gradient), std::move(prior.information)};
    add_springs(free, all);
    add_counts(free, all);
    return all;
}

double LogPosterior::value(const Eigen::Ref<const Eigen::VectorXd>& free) const {
    const Eigen::VectorXd row = parameters_.row_at(free);
    if (!parameters_.space().is_inside_walls(row))
        return -std::numeric_limits<double>::infinity();
    double value = prior_expansion(parameters_, free).value +
                   log_likelihood(parameters_.space(), totals_, row, engines_.sums(row), 0);
    for (const Beyond& one : beyond(free))
        value -= 0.5 * stiffness_[one.vector] * one.distance * one.distance;
    return value;
}

}  // namespace deviascope
