// SPDX-License-Identifier: GPL-2.0-or-later
#include "model/moment_bound.h"

#include <algorithm>
#include <cmath>

#include "deviascope/counts/moments.h"

namespace deviascope {
namespace {

/// Below this part of the isotropic expectation the bound of E is not used.
constexpr double least_expected = 0.05;

}  // namespace

MomentBound::MomentBound(const Counts& counts, const ParameterSpace& space, double tolerance)
    : half_tolerance_(0.5 * tolerance),
      monopoles_sampled_(space.options().monopole.sampled),
      terms_(space.terms()),
      totals_(totals_of(counts, space)) {
    for (std::size_t t = 0; t < terms_.size(); ++t) {
        const BinTerm& term = terms_[t];
        sources_and_shapes_ += totals_[t].sources + space.options().monopole.shape;
        auto found = std::find_if(feelers_.begin(), feelers_.end(), [&](const Feelers& one) {
            return one.intrinsic == term.intrinsic && one.bias_ratio == term.bias_ratio;
        });
        if (found == feelers_.end())
            found = feelers_.insert(feelers_.end(), {term.intrinsic, term.bias_ratio, 0.0});
        found->sources += totals_[t].sources;
    }
}

MomentBound::Extent MomentBound::extent_of(const Eigen::Ref<const Eigen::VectorXd>& row) const {
    Extent extent;
    extent.speed = row.head<3>().norm();
    for (const Feelers& one : feelers_)
        extent.largest_dipole =
            std::max(extent.largest_dipole,
                     std::abs(one.bias_ratio) * row.segment<3>(one.intrinsic).norm());
    for (std::size_t t = 0; t < terms_.size(); ++t) {
        const double weight = std::abs(row[terms_[t].weight]);
        extent.largest_weight = std::max(extent.largest_weight, weight);
        extent.weighted_sources += weight * totals_[t].sources;
        if (monopoles_sampled_)
            extent.expected_scale += row[terms_[t].monopole] * totals_[t].exposed;
    }
    if (!monopoles_sampled_) extent.expected_scale = sources_and_shapes_;
    return extent;
}

int MomentBound::velocity_degree(const Extent& extent) const {
    const double b = extent.speed, d = extent.largest_dipole, weight = extent.largest_weight;
    // (1 -+ b)^(-+B) by Bernoulli's inequality.
    const double least_kinematic = 1.0 - std::max(1.0, weight) * b;
    const double least = monopoles_sampled_ ? least_kinematic : (1.0 - d) * least_kinematic;
    if (least < least_expected) return 0;
    double power = b;          // b^(K+1)
    double binomial = weight;  // C(B+K, K+1)
    for (int degree = 1; degree <= moment_degree; ++degree) {
        const double k = degree;
        power *= b;
        binomial *= (weight + k) / (k + 1.0);
        const double ratio = b * std::max(1.0, (weight + k + 1.0) / (k + 2.0));
        if (ratio >= 1.0) return 0;
        const double truncated = (1.0 + d) * binomial * power / (1.0 - ratio);
        const double left = monopoles_sampled_ ? least : least - truncated;
        if (left <= 0.0) continue;
        const double counted = extent.weighted_sources * power / ((k + 1.0) * (1.0 - b));
        const double expected = extent.expected_scale * truncated / left;
        if (counted + expected <= half_tolerance_) return degree;
    }
    return 0;
}

int MomentBound::intrinsic_degree(const Eigen::Ref<const Eigen::VectorXd>& row) const {
    std::array<double, moment_degree + 1> error{};
    for (const Feelers& one : feelers_) {
        const double d = std::abs(one.bias_ratio) * row.segment<3>(one.intrinsic).norm();
        double power = one.sources * d / (1.0 - d);
        for (int degree = 1; degree <= moment_degree; ++degree)
            error[static_cast<std::size_t>(degree)] += (power *= d) / (degree + 1.0);
    }
    for (int degree = 1; degree <= moment_degree; ++degree)
        if (error[static_cast<std::size_t>(degree)] <= half_tolerance_) return degree;
    return 0;
}

MomentEngine::Degrees MomentBound::degrees_for(
    const Eigen::Ref<const Eigen::VectorXd>& row) const {
    const Extent extent = extent_of(row);
    if (!(extent.speed < 1.0 && extent.largest_dipole < 1.0)) return {};
    const MomentEngine::Degrees degrees{velocity_degree(extent), intrinsic_degree(row)};
    return degrees.velocity > 0 && degrees.intrinsic > 0 ? degrees : MomentEngine::Degrees{};
}

}  // namespace deviascope
