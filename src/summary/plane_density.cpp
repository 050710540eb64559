// SPDX-License-Identifier: GPL-2.0-or-later
#include "deviascope/summary/plane_density.h"

#include <algorithm>
#include <cmath>
#include <functional>

#include "deviascope/core/error.h"
#include "deviascope/summary/interval.h"
#include "summary/boundary_kernel.h"

namespace deviascope {
namespace {

constexpr Eigen::Index n_nodes = 129;
constexpr double widest = 6.0;  // standard deviations; draws farther out carry no density

Eigen::Matrix2Xd pairs_of(std::span<const double> x, std::span<const double> y) {
    ensure(x.size() == y.size() && !x.empty(), "pairs have two values");
    const auto n = static_cast<Eigen::Index>(x.size());
    Eigen::Matrix2Xd pairs(2, n);
    pairs.row(0) = Eigen::Map<const Eigen::RowVectorXd>(x.data(), n);
    pairs.row(1) = Eigen::Map<const Eigen::RowVectorXd>(y.data(), n);
    return pairs;
}

/// Whether draws come so near an end that kernels reach beyond it.
bool is_near_an_end(const Eigen::RowVectorXd& values, double sd, const Support& support) {
    const double reach = 1.5 * sd;
    return (support.lowest && values.minCoeff() < *support.lowest + reach) ||
           (support.highest && values.maxCoeff() > *support.highest - reach);
}

/// Ends of the support of a coordinate after it was shifted and scaled.
Support moved(const Support& support, double mean, double sd) {
    Support result;
    if (support.lowest) result.lowest = (*support.lowest - mean) / sd;
    if (support.highest) result.highest = (*support.highest - mean) / sd;
    return result;
}

Eigen::ArrayXXd binned_on(const AxisKernel& first,
                          const AxisKernel& second,
                          const Eigen::Matrix2Xd& points) {
    Eigen::ArrayXXd binned = Eigen::ArrayXXd::Zero(n_nodes, n_nodes);
    for (Eigen::Index draw = 0; draw < points.cols(); ++draw) {
        if (points.col(draw).cwiseAbs().maxCoeff() > widest) continue;
        const auto [column, right] = first.share_of(points(0, draw));
        const auto [row, upper] = second.share_of(points(1, draw));
        binned(row, column) += (1.0 - upper) * (1.0 - right);
        binned(row, column + 1) += (1.0 - upper) * right;
        binned(row + 1, column) += upper * (1.0 - right);
        binned(row + 1, column + 1) += upper * right;
    }
    return binned;
}

/// A kernel operator along both axes, one after the other.
template <class Operator>
Eigen::ArrayXXd along_both(const AxisKernel& first,
                           const AxisKernel& second,
                           Eigen::ArrayXXd field,
                           const Operator& apply) {
    for (Eigen::Index row = 0; row < n_nodes; ++row)
        field.row(row) = apply(first, field.row(row).transpose()).transpose();
    for (Eigen::Index column = 0; column < n_nodes; ++column)
        field.col(column) = apply(second, field.col(column));
    return field;
}

Eigen::ArrayXXd smoothed(const AxisKernel& first,
                         const AxisKernel& second,
                         const Eigen::ArrayXXd& binned) {
    const Eigen::ArrayXXd plain =
        along_both(first, second, binned, [](const AxisKernel& axis, const Eigen::ArrayXd& b) {
            return Eigen::ArrayXd(axis.plain(b) / axis.mass());
        });
    const Eigen::ArrayXXd linear =
        along_both(first, second, binned, [](const AxisKernel& axis, const Eigen::ArrayXd& b) {
            return axis.linear(b);
        });
    return plain.binaryExpr(linear, &non_negative);
}

}  // namespace

PlaneDensity::PlaneDensity(std::span<const double> x,
                           std::span<const double> y,
                           double effective_draws,
                           const std::array<Support, 2>& supports) {
    Eigen::Matrix2Xd pairs = pairs_of(x, y);
    const auto n = static_cast<double>(pairs.cols());
    mean_ = pairs.rowwise().mean();
    const Eigen::Matrix2Xd centred = pairs.colwise() - mean_;
    const Eigen::Matrix2d covariance = centred * centred.transpose() / n;
    const Eigen::Array2d sd = covariance.diagonal().array().sqrt();
    if (!(sd > 0.0).all()) return;
    const double correlation = covariance(0, 1) / sd.prod();
    if (!(std::abs(correlation) < 1.0 - 1e-9)) return;
    const bool bounded = is_near_an_end(pairs.row(0), sd[0], supports[0]) ||
                         is_near_an_end(pairs.row(1), sd[1], supports[1]);
    factor_ << sd[0], 0.0, 0.0, sd[1];
    if (!bounded) {
        factor_(1, 0) = correlation * sd[1];
        factor_(1, 1) = sd[1] * std::sqrt(1.0 - correlation * correlation);
    }
    const Eigen::Matrix2Xd whitened = factor_.triangularView<Eigen::Lower>().solve(centred);
    const std::array<Support, 2> ends =
        bounded ? std::array<Support, 2>{moved(supports[0], mean_[0], sd[0]),
                                         moved(supports[1], mean_[1], sd[1])}
                : std::array<Support, 2>{};
    lay_grid(whitened, ends);
    const double bandwidth = 1.2 * std::pow(std::clamp(effective_draws, 1.0, n), -1.0 / 6.0);
    const AxisKernel first(corner_[0], cell_[0], n_nodes, bandwidth, ends[0]);
    const AxisKernel second(corner_[1], cell_[1], n_nodes, bandwidth, ends[1]);
    density_ = smoothed(first, second, binned_on(first, second, whitened));
    for (Eigen::Index draw = 0; draw < pairs.cols(); ++draw)
        at_draws_.push_back(at(pairs(0, draw), pairs(1, draw)));
    std::sort(at_draws_.begin(), at_draws_.end(), std::greater<>());
}

void PlaneDensity::lay_grid(const Eigen::Matrix2Xd& whitened,
                            const std::array<Support, 2>& supports) {
    constexpr double margin = 1.2;
    for (Eigen::Index axis = 0; axis < 2; ++axis) {
        const Support& support = supports[static_cast<std::size_t>(axis)];
        double lo = std::max(whitened.row(axis).minCoeff(), -widest) - margin;
        double hi = std::min(whitened.row(axis).maxCoeff(), widest) + margin;
        if (support.lowest) lo = std::max(lo, *support.lowest);
        if (support.highest) hi = std::min(hi, *support.highest);
        corner_[axis] = lo;
        cell_[axis] = (hi - lo) / static_cast<double>(n_nodes - 1);
    }
}

Eigen::Vector2d PlaneDensity::pair_at(double column, double row) const {
    const Eigen::Vector2d whitened = (corner_ + cell_ * Eigen::Array2d(column, row)).matrix();
    return mean_ + factor_ * whitened;
}

Eigen::Vector2d PlaneDensity::place_of(double x, double y) const {
    const Eigen::Vector2d whitened =
        factor_.triangularView<Eigen::Lower>().solve(Eigen::Vector2d(x, y) - mean_);
    return ((whitened.array() - corner_) / cell_).matrix();
}

double PlaneDensity::at(double x, double y) const {
    const Eigen::Vector2d place = place_of(x, y);
    if (!((place.array() >= -1e-9).all() && (place.array() <= n_nodes - 1 + 1e-9).all()))
        return 0.0;
    const auto column = std::clamp<Eigen::Index>(Eigen::Index(place[0]), 0, n_nodes - 2);
    const auto row = std::clamp<Eigen::Index>(Eigen::Index(place[1]), 0, n_nodes - 2);
    const double right = place[0] - double(column), upper = place[1] - double(row);
    return (1.0 - upper) *
               ((1.0 - right) * density_(row, column) + right * density_(row, column + 1)) +
           upper * ((1.0 - right) * density_(row + 1, column) +
                    right * density_(row + 1, column + 1));
}

double PlaneDensity::level(double probability) const {
    return at_draws_[draws_holding(at_draws_.size(), probability) - 1];
}

}  // namespace deviascope
