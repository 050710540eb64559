// SPDX-License-Identifier: GPL-2.0-or-later
#include "deviascope/summary/direction_density.h"

#include <algorithm>
#include <functional>
#include <limits>

#include "deviascope/core/error.h"
#include "deviascope/core/physical_constants.h"
#include "deviascope/summary/interval.h"
#include "summary/sphere_density.h"
#include "summary/tangent_density.h"

namespace deviascope {
namespace {

constexpr double compact_radius = 40.0 * radians_per_degree;

bool is_compact(std::span<const Direction> draws, const MeanDirection& mean) {
    return mean.length >= least_mean_length &&
           radius_about(draws, mean.direction, level95) < compact_radius;
}

std::unique_ptr<SkyDensity> density_of(std::span<const Direction> draws,
                                       double effective_draws) {
    const MeanDirection mean = mean_direction(draws);
    if (is_compact(draws, mean))
        return std::make_unique<TangentDensity>(draws, mean.direction, effective_draws);
    return std::make_unique<SphereDensity>(draws, mean.length, effective_draws);
}

}  // namespace

MeanDirection mean_direction(std::span<const Direction> draws) {
    Eigen::Vector3d sum = Eigen::Vector3d::Zero();
    for (const Direction& draw : draws) sum += draw;
    const double length = draws.empty() ? 0.0 : sum.norm() / static_cast<double>(draws.size());
    if (length < least_mean_length)
        return {Direction::Constant(std::numeric_limits<double>::quiet_NaN()), length};
    return {sum.normalized(), length};
}

double radius_about(std::span<const Direction> draws,
                    const Direction& centre,
                    double probability) {
    std::vector<double> distance(draws.size());
    std::transform(draws.begin(), draws.end(), distance.begin(), [&](const Direction& draw) {
        return separation(draw, centre);
    });
    std::sort(distance.begin(), distance.end());
    return quantile_of(distance, probability);
}

struct DirectionDensity::Parts {
    std::unique_ptr<SkyDensity> density;
    std::vector<double> at_draws;  ///< falling
};

DirectionDensity::DirectionDensity(std::span<const Direction> draws, double effective_draws)
    : parts_(std::make_unique<Parts>()) {
    ensure(!draws.empty(), "a direction density has draws");
    const auto n = static_cast<double>(draws.size());
    parts_->density = density_of(draws, std::clamp(effective_draws, 1.0, n));
    parts_->at_draws = parts_->density->at_each(draws);
    std::sort(parts_->at_draws.begin(), parts_->at_draws.end(), std::greater<>());
}

DirectionDensity::~DirectionDensity() = default;
DirectionDensity::DirectionDensity(DirectionDensity&&) noexcept = default;

double DirectionDensity::at(const Direction& direction) const {
    return parts_->density->at(direction);
}

double DirectionDensity::level(double probability) const {
    return parts_->at_draws[draws_holding(parts_->at_draws.size(), probability) - 1];
}

double DirectionDensity::area_deg2(double probability) const {
    constexpr double deg2_per_steradian = 1.0 / (radians_per_degree * radians_per_degree);
    return parts_->density->area_above(level(probability)) * deg2_per_steradian;
}

}  // namespace deviascope
