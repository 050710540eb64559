// SPDX-License-Identifier: GPL-2.0-or-later
#include "weights/density_fit.h"

#include <Eigen/Cholesky>
#include <Eigen/QR>
#include <algorithm>
#include <cmath>
#include <limits>
#include <numbers>
#include <utility>

#include "deviascope/core/error.h"

namespace deviascope {

namespace {

constexpr int most_steps = 60;
constexpr double tolerance = 1e-10;  // of a coefficient
constexpr double steepest = 60.0;    // |ln f| across the window beyond which there is no fit
constexpr int most_halvings = 12;

/// Larger of the distances of the two ends.
double scale_of(const std::vector<double>& boundary) {
    return std::max(std::abs(boundary.front()), std::abs(boundary.back()));
}

double centre_of(const std::vector<double>& boundary, Eigen::Index cell) {
    const auto i = static_cast<std::size_t>(cell);
    return 0.5 * (boundary[i] + boundary[i + 1]);
}

}  // namespace

double FittedDensity::at_edge() const {
    return std::exp(coefficient[0]);
}

double FittedDensity::at(double y) const {
    double sum = 0.0;
    for (Eigen::Index k = coefficient.size(); k-- > 0;)
        sum = sum * (y / scale) + coefficient[k];
    return std::exp(sum);
}

/// What the density of some coefficients expects of the cells.
struct DensityFit::Expectation {
    double log_likelihood = 0.0;
    Eigen::VectorXd gradient;
    Eigen::MatrixXd information;
};

DensityFit::DensityFit(std::vector<double> boundary, int degree)
    : degree_(degree), scale_(scale_of(boundary)), n_cells_(std::ssize(boundary) - 1) {
    ensure(n_cells_ > degree, "a window has more cells than coefficients");
    weight_.resize(2 * n_cells_);
    power_.resize(2 * n_cells_, degree + 1);
    for (Eigen::Index cell = 0; cell < n_cells_; ++cell) {
        const auto i = static_cast<std::size_t>(cell);
        const double half = 0.5 * (boundary[i + 1] - boundary[i]);
        for (Eigen::Index side = 0; side < 2; ++side) {
            const Eigen::Index node = 2 * cell + side;
            const double offset = (side == 0 ? -1.0 : 1.0) * half / std::numbers::sqrt3;
            weight_[node] = half;
            power_(node, 0) = 1.0;
            for (Eigen::Index k = 1; k <= degree; ++k)
                power_(node, k) =
                    power_(node, k - 1) * (centre_of(boundary, cell) + offset) / scale_;
        }
    }
}

DensityFit::Expectation DensityFit::expect(const Eigen::VectorXd& coefficient,
                                           std::span<const double> count) const {
    const Eigen::Index n = degree_ + 1;
    Expectation out{0.0, Eigen::VectorXd::Zero(n), Eigen::MatrixXd::Zero(n, n)};
    Eigen::ArrayXd exponent = coefficient[0] * power_.col(0).array();
    for (Eigen::Index k = 1; k < n; ++k) exponent += coefficient[k] * power_.col(k).array();
    const Eigen::ArrayXd density = exponent.exp() * weight_.array();
    Eigen::VectorXd slope(n);
    for (Eigen::Index cell = 0; cell < n_cells_; ++cell) {
        const double mean = density[2 * cell] + density[2 * cell + 1];
        const double found = count[static_cast<std::size_t>(cell)];
        slope = density[2 * cell] * power_.row(2 * cell).transpose() +
                density[2 * cell + 1] * power_.row(2 * cell + 1).transpose();
        out.log_likelihood += (found > 0.0 ? found * std::log(mean) : 0.0) - mean;
        out.gradient += (found / mean - 1.0) * slope;
        out.information += slope * slope.transpose() / mean;
    }
    return out;
}

Eigen::VectorXd DensityFit::constant_density(std::span<const double> count) const {
    double total = 0.0;
    for (const double n : count) total += n;
    Eigen::VectorXd coefficient = Eigen::VectorXd::Zero(degree_ + 1);
    coefficient[0] = std::log(total / weight_.sum());
    return coefficient;
}

std::optional<FittedDensity> DensityFit::fit(std::span<const double> count,
                                             const FittedDensity* start) const {
    ensure(std::ssize(count) == n_cells_, "there is one count for each cell");
    const auto filled =
        std::count_if(count.begin(), count.end(), [](double n) { return n > 0; });
    if (filled <= degree_) return std::nullopt;
    Eigen::VectorXd at = start != nullptr ? start->coefficient : constant_density(count);
    Expectation now = expect(at, count);
    for (int step = 0; step < most_steps; ++step) {
        const Eigen::LDLT<Eigen::MatrixXd> factor(now.information);
        Eigen::VectorXd move = factor.solve(now.gradient);
        Expectation next = expect(at + move, count);
        for (int half = 0; half < most_halvings && !(next.log_likelihood >= now.log_likelihood);
             ++half) {
            move *= 0.5;
            next = expect(at + move, count);
        }
        at += move;
        now = std::move(next);
        if (!at.allFinite() || at.tail(degree_).lpNorm<Eigen::Infinity>() > steepest)
            return std::nullopt;
        if (move.lpNorm<Eigen::Infinity>() > tolerance) continue;
        const Eigen::VectorXd unit = Eigen::VectorXd::Unit(degree_ + 1, 0);
        return FittedDensity{at, scale_, now.information.ldlt().solve(unit)[0]};
    }
    return std::nullopt;
}

double mean_at_edge(const std::vector<double>& boundary,
                    std::span<const double> count,
                    std::span<const double> sum,
                    int degree) {
    const auto n_cells = std::ssize(boundary) - 1;
    const double scale = scale_of(boundary);
    Eigen::MatrixXd normal = Eigen::MatrixXd::Zero(degree + 1, degree + 1);
    Eigen::VectorXd right = Eigen::VectorXd::Zero(degree + 1);
    Eigen::VectorXd power(degree + 1);
    for (Eigen::Index cell = 0; cell < n_cells; ++cell) {
        const auto i = static_cast<std::size_t>(cell);
        power[0] = 1.0;
        for (Eigen::Index k = 1; k <= degree; ++k)
            power[k] = power[k - 1] * centre_of(boundary, cell) / scale;
        normal += count[i] * power * power.transpose();
        right += sum[i] * power;
    }
    if (!(normal(0, 0) > 0.0)) return std::numeric_limits<double>::quiet_NaN();
    const Eigen::LDLT<Eigen::MatrixXd> factor(normal);
    const bool determined =
        factor.isPositive() && factor.vectorD().minCoeff() > 1e-9 * factor.vectorD().maxCoeff();
    return determined ? factor.solve(right)[0] : right[0] / normal(0, 0);
}

}  // namespace deviascope
