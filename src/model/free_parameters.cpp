// SPDX-License-Identifier: GPL-2.0-or-later
#include "model/free_parameters.h"

#include <algorithm>
#include <cmath>
#include <limits>

#include "model/bin_likelihood.h"

namespace deviascope {
namespace {

constexpr double just_inside = 1.0 - 1e-9;

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

/// Largest t in 0 … 1 with |from + t step| <= radius; from lies inside.
double step_in_ball(const Eigen::Vector3d& from, const Eigen::Vector3d& step, double radius) {
    if ((from + step).norm() <= radius) return 1.0;
    const double a = step.squaredNorm(), half_b = from.dot(step);
    const double c = std::max(0.0, radius * radius - from.squaredNorm());
    return c / (half_b + std::sqrt(half_b * half_b + a * c));
}

/// Largest t in 0 … 1 with 0 <= from + t step <= max; from lies inside.
double step_in_range(double from, double step, double max) {
    if (step > 0.0) return std::min(1.0, (max - from) / step);
    if (step < 0.0) return std::min(1.0, from / -step);
    return 1.0;
}

}  // namespace

Eigen::MatrixXd free_directions(const ParameterSpace& space) {
    Eigen::MatrixXd directions =
        Eigen::MatrixXd::Zero(space.n_parameters(), space.n_coordinates());
    for (std::size_t v = 0; v < space.vectors().size(); ++v) {
        const VectorPrior& prior = space.vector_prior(v);
        if (prior.n_coordinates() == 0) continue;  // fixed: no column
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

FreeParameters::FreeParameters(const Counts& counts, const ParameterSpace& space)
    : space_(&space), origin_(origin_of(counts, space)), directions_(free_directions(space)) {}

Eigen::VectorXd FreeParameters::row_at(const Eigen::Ref<const Eigen::VectorXd>& free) const {
    const Eigen::VectorXd change = directions_ * free;
    Eigen::VectorXd row = origin_;
    const Eigen::Index n = space_->n_parameters() - std::ssize(space_->terms());
    row.head(n) += change.head(n);
    row.tail(row.size() - n).array() *= change.tail(row.size() - n).array().exp();
    return row;
}

Eigen::VectorXd FreeParameters::coordinates_at(
    const Eigen::Ref<const Eigen::VectorXd>& free) const {
    return space_->to_coordinates(row_at(free));
}

Eigen::Index FreeParameters::first_of(std::size_t v) const {
    return space_->vector_places()[v].coordinate;
}

Eigen::Index FreeParameters::size_of(std::size_t v) const {
    return space_->vector_prior(v).n_coordinates();
}

double FreeParameters::furthest(std::size_t v) const {
    return just_inside * std::min(space_->vector_prior(v).furthest(),
                                  1.0 / space_->vector_places()[v].largest_ratio);
}

Eigen::VectorXd FreeParameters::inside() const {
    Eigen::VectorXd free = Eigen::VectorXd::Zero(size());
    for (std::size_t v = 0; v < space_->vectors().size(); ++v)
        if (size_of(v) == 1) free[first_of(v)] = 0.5 * furthest(v);
    return free;
}

bool FreeParameters::is_inside(const Eigen::Ref<const Eigen::VectorXd>& free) const {
    for (std::size_t v = 0; v < space_->vectors().size(); ++v) {
        const auto vector = free.segment(first_of(v), size_of(v));
        if (vector.norm() > furthest(v)) return false;
        if (size_of(v) == 1 && vector[0] < 0.0) return false;
    }
    return true;
}

double FreeParameters::longest_step(const Eigen::Ref<const Eigen::VectorXd>& from,
                                    const Eigen::Ref<const Eigen::VectorXd>& step) const {
    double longest = 1.0;
    for (std::size_t v = 0; v < space_->vectors().size(); ++v) {
        const Eigen::Index first = first_of(v);
        if (size_of(v) == 3)
            longest = std::min(
                longest,
                step_in_ball(from.segment<3>(first), step.segment<3>(first), furthest(v)));
        else if (size_of(v) == 1)
            longest = std::min(longest, step_in_range(from[first], step[first], furthest(v)));
    }
    return longest;
}

}  // namespace deviascope
