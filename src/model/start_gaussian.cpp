// SPDX-License-Identifier: GPL-2.0-or-later
#include "model/start_gaussian.h"

#include <Eigen/Eigenvalues>
#include <algorithm>
#include <cmath>
#include <limits>
#include <numeric>

#include "deviascope/model/information.h"
#include "model/bin_likelihood.h"
#include "model/prior_information.h"

namespace deviascope {
namespace {

/// Free vectors 0, weights at their means, sampled monopoles at (N + a) / (E0 + b), redrawn
/// ones NaN (their maximum).
Eigen::VectorXd origin_of(const Counts& counts, const ParameterSpace& space) {
    const ModelOptions& options = space.options();
    Eigen::VectorXd row = Eigen::VectorXd::Zero(space.n_parameters());
    for (std::size_t v = 0; v < space.vectors().size(); ++v)
        if (const auto* fixed = std::get_if<FixedPrior>(&space.vector_prior(v).kind()))
            row.segment<3>(space.vector_places()[v].parameter) = fixed->value;
    for (std::size_t s = 0; s < options.surveys.size(); ++s) {
        const Eigen::VectorXd& mean = options.surveys[s].weights.mean;
        row.segment(space.weight_places()[s].parameter, mean.size()) = mean;
    }
    const std::vector<BinTotals> totals = totals_of(counts, space);
    const MonopolePrior& prior = options.monopole;
    for (std::size_t t = 0; t < totals.size(); ++t)
        row[space.terms()[t].monopole] =
            prior.sampled ? (totals[t].sources + prior.shape) / (totals[t].exposed + prior.rate)
                          : std::numeric_limits<double>::quiet_NaN();
    return row;
}

/// Information of the counts on the free parameters, redrawn monopoles eliminated.
Eigen::MatrixXd information_on_free(const ParameterSpace& space,
                                    const Eigen::MatrixXd& directions,
                                    const Eigen::MatrixXd& information) {
    if (space.options().monopole.sampled)
        return directions.transpose() * information * directions;
    const Eigen::Index n = space.n_parameters() - std::ssize(space.terms());
    std::vector<Eigen::Index> keep(static_cast<std::size_t>(n)),
        monopoles(space.terms().size());
    std::iota(keep.begin(), keep.end(), 0);
    std::iota(monopoles.begin(), monopoles.end(), n);
    return directions.topRows(n).transpose() * eliminate(information, keep, monopoles) *
           directions.topRows(n);
}

/// F with F F^T = the inverse of a positive definite matrix. Eigenvalues of its correlation
/// form below 1e-13 of the largest are rounding errors and are raised to that.
Eigen::MatrixXd inverse_factor(const Eigen::MatrixXd& information) {
    if (information.size() == 0) return information;  // nothing is sampled
    const Eigen::VectorXd scale = information.diagonal().cwiseSqrt().cwiseInverse();
    const Eigen::SelfAdjointEigenSolver<Eigen::MatrixXd> solver(
        Eigen::MatrixXd(scale.asDiagonal() * information * scale.asDiagonal()));
    const double least = 1e-13 * solver.eigenvalues().maxCoeff();
    const Eigen::VectorXd width =
        solver.eigenvalues().cwiseMax(least).cwiseSqrt().cwiseInverse();
    return scale.asDiagonal() * solver.eigenvectors() * width.asDiagonal();
}

/// Largest t in 0 … 1 with |from + t step| <= radius; from lies inside.
double step_in_ball(const Eigen::Vector3d& from, const Eigen::Vector3d& step, double radius) {
    if ((from + step).norm() <= radius) return 1.0;
    const double a = step.squaredNorm(), half_b = from.dot(step);
    const double c = radius * radius - from.squaredNorm();  // >= 0
    return c / (half_b + std::sqrt(half_b * half_b + a * c));
}

/// Largest t in 0 … 1 with 0 <= from + t step <= max; from lies inside.
double step_in_range(double from, double step, double max) {
    if (step > 0.0) return std::min(1.0, (max - from) / step);
    if (step < 0.0) return std::min(1.0, from / -step);
    return 1.0;
}

}  // namespace

StartGaussian::StartGaussian(const Counts& counts, const ParameterSpace& space)
    : space_(space), origin_(origin_of(counts, space)), directions_(free_directions(space)) {
    const Derivatives of_counts = derivatives(counts, space, origin_);
    const PriorInformation of_priors = prior_information(space, origin_);
    const Eigen::MatrixXd information =
        information_on_free(space, directions_, of_counts.information) + of_priors.information;
    const Eigen::VectorXd gradient =
        directions_.transpose() * of_counts.score + of_priors.gradient;
    const Eigen::MatrixXd factor = inverse_factor(information);
    factor_ = 2.0 * factor;
    mean_ = factor * (factor.transpose() * gradient);
    // A mean outside the priors' balls is drawn back towards a point inside all of them.
    Eigen::VectorXd inside = Eigen::VectorXd::Zero(mean_.size());
    for (std::size_t v = 0; v < space.vectors().size(); ++v)
        if (const auto* along = std::get_if<AxisPrior>(&space.vector_prior(v).kind()))
            inside[space.vector_places()[v].coordinate] =
                0.5 * std::min(along->max, 1.0 / space.vector_places()[v].largest_ratio);
    const double step = longest_step(inside, mean_ - inside);
    if (step < 1.0) mean_ = inside + 0.9 * step * (mean_ - inside);
}

double StartGaussian::longest_step(const Eigen::VectorXd& from,
                                   const Eigen::VectorXd& step) const {
    constexpr double just_inside = 1.0 - 1e-9;
    double longest = 1.0;
    for (std::size_t v = 0; v < space_.vectors().size(); ++v) {
        const VectorPrior& prior = space_.vector_prior(v);
        const ParameterSpace::VectorPlace& place = space_.vector_places()[v];
        const Eigen::Index c = place.coordinate;
        const double radius =
            just_inside * std::min(prior.furthest(), 1.0 / place.largest_ratio);
        if (prior.n_coordinates() == 3)
            longest =
                std::min(longest, step_in_ball(from.segment<3>(c), step.segment<3>(c), radius));
        else if (prior.n_coordinates() == 1)
            longest = std::min(longest, step_in_range(from[c], step[c], radius));
    }
    return longest;
}

void StartGaussian::draw(Stream& stream, Eigen::Ref<Eigen::VectorXd> coordinates) const {
    Eigen::VectorXd standard(mean_.size());
    for (double& component : standard) component = normal(stream);
    const double u = uniform(stream);
    const Eigen::VectorXd step = factor_ * standard;
    const double longest = longest_step(mean_, step);
    const double taken = longest < 1.0 ? longest * std::cbrt(u) : 1.0;
    const Eigen::VectorXd change = directions_ * (mean_ + taken * step);
    Eigen::VectorXd row = origin_;
    const Eigen::Index n = space_.n_parameters() - std::ssize(space_.terms());
    row.head(n) += change.head(n);
    row.tail(row.size() - n).array() *= change.tail(row.size() - n).array().exp();
    coordinates = space_.to_coordinates(row);
}

}  // namespace deviascope
