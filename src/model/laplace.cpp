// SPDX-License-Identifier: GPL-2.0-or-later
#include "model/laplace.h"

#include <fmt/format.h>
#include <fmt/ranges.h>

#include <Eigen/Cholesky>
#include <Eigen/Eigenvalues>
#include <algorithm>
#include <cmath>
#include <numbers>

#include "model/log_posterior.h"

namespace deviascope {
namespace {

constexpr int most_newton_steps = 200;
constexpr int most_halvings = 40;
constexpr int most_stiffenings = 6;
constexpr double settled_gain = 1e-9;  ///< of ln posterior, expected of one more step
constexpr std::uint64_t n_keyed_draws = 4096;
constexpr double most_outside = 0.01;

/// A symmetric matrix in units of a positive definite one.
struct Relative {
    Eigen::VectorXd eigenvalues;
    Eigen::MatrixXd directions;  ///< columns v with v^T metric v = 1
    Eigen::MatrixXd dual;        ///< metric times directions

    Relative(const Eigen::MatrixXd& matrix, const Eigen::MatrixXd& metric) {
        const Eigen::LLT<Eigen::MatrixXd> cholesky(metric);
        const auto lower = cholesky.matrixL();
        const Eigen::MatrixXd half = lower.solve(matrix);
        const Eigen::MatrixXd whole = lower.solve(half.transpose());
        const Eigen::SelfAdjointEigenSolver<Eigen::MatrixXd> solver(
            Eigen::MatrixXd(0.5 * (whole + whole.transpose())));
        eigenvalues = solver.eigenvalues();
        directions = lower.transpose().solve(solver.eigenvectors());
        dual = lower * solver.eigenvectors();
    }
    /// Eigenvalues not below those of the metric.
    Eigen::VectorXd floored() const { return eigenvalues.cwiseMax(1.0); }
};

/// Mean and variance of t >= 0 with density ~ exp(-slope t - curvature t^2 / 2), slope > 0.
/// Source: Johnson, Kotz & Balakrishnan 1994, Continuous Univariate Distributions 1, 13.10.
struct Truncated {
    double mean, variance;
    Truncated(double slope, double curvature) {
        const double alpha = slope / std::sqrt(curvature);
        constexpr double far = 25.0;  // then an exponential, to 1 / alpha^2
        if (alpha > far) {
            mean = 1.0 / slope;
            variance = mean * mean;
            return;
        }
        const double mills = std::exp(-0.5 * alpha * alpha) * std::numbers::sqrt2 *
                             std::numbers::inv_sqrtpi / std::erfc(alpha / std::numbers::sqrt2);
        mean = (mills - alpha) / std::sqrt(curvature);
        variance = (1.0 + alpha * mills - mills * mills) / curvature;
    }
};

}  // namespace

/// The search for the mode.
class Laplace::Fit {
  public:
    Fit(const Counts& counts, const FreeParameters& parameters, const Engines& engines)
        : parameters_(parameters), posterior_(counts, parameters, engines) {
        mode_ = parameters.inside();
        metric_ =
            prior_expansion(parameters, mode_).information + bounded_information(parameters);
        const MonopolePrior& prior = parameters.space().options().monopole;
        if (prior.sampled) add_monopoles_to_metric(totals_of(counts, parameters.space()));
    }

    void climb() {
        for (int round = 0; round < most_stiffenings; ++round) {
            for (int step = 0; step < most_newton_steps; ++step)
                if (!improve()) break;
            if (!stiffen()) return;
        }
    }

    /// Replaces each spring by the truncated normal across its bound.
    void give_way_to_bounds() {
        LogPosterior::Expansion at_mode = posterior_.at(mode_);
        for (const LogPosterior::Beyond& one : posterior_.beyond(mode_))
            at_mode.curvature -=
                posterior_.stiffness()[one.vector] * one.outward * one.outward.transpose();
        const Relative relative(at_mode.curvature, metric_);
        name_unmeasured(relative);
        precision_ =
            relative.dual * relative.floored().asDiagonal() * relative.dual.transpose();
        for (const LogPosterior::Beyond& one : posterior_.beyond(mode_)) {
            const double curvature = one.outward.dot(precision_ * one.outward);
            const Truncated depth(posterior_.stiffness()[one.vector] * one.distance, curvature);
            precision_ +=
                (1.0 / depth.variance - curvature) * one.outward * one.outward.transpose();
            const double inward = parameters_.size_of(one.vector) == 1
                                      ? depth.mean
                                      : std::min(depth.mean, 0.9 * one.bound);
            mode_ -= (one.distance + inward) * one.outward;
        }
    }

    const Eigen::VectorXd& mean() const { return mode_; }
    /// Lower Cholesky factor of the covariance.
    Eigen::MatrixXd factor() const {
        const Eigen::Index n = mode_.size();
        const Eigen::MatrixXd covariance =
            precision_.llt().solve(Eigen::MatrixXd::Identity(n, n));
        return Eigen::MatrixXd(covariance.llt().matrixL());
    }
    std::vector<std::string> take_warnings() { return std::move(warnings_); }

  private:
    /// Their prior may have no information. A hundredth of what the counts give sets the scale
    /// and stays below the curvature.
    void add_monopoles_to_metric(const std::vector<BinTotals>& totals) {
        const Eigen::Index first = mode_.size() - std::ssize(totals);
        for (std::size_t t = 0; t < totals.size(); ++t) {
            const Eigen::Index at = first + static_cast<Eigen::Index>(t);
            metric_(at, at) += 0.01 * std::max(totals[t].sources, 1.0);
        }
    }

    /// One Newton step with backtracking; false when there is nothing left to gain.
    bool improve() {
        const LogPosterior::Expansion here = posterior_.at(mode_);
        const Relative relative(here.curvature, metric_);
        const Eigen::VectorXd step = relative.directions *
                                     relative.floored().cwiseInverse().asDiagonal() *
                                     (relative.directions.transpose() * here.gradient);
        const double slope = here.gradient.dot(step);
        if (!(slope > settled_gain)) return false;
        const double from = posterior_.value(mode_);
        double length = 1.0;
        for (int halving = 0; halving < most_halvings; ++halving, length *= 0.5) {
            const Eigen::VectorXd there = mode_ + length * step;
            // Armijo's rule (Nocedal & Wright 2006, Numerical Optimization, eq. 3.4).
            if (posterior_.value(there) < from + 1e-4 * length * slope) continue;
            mode_ = there;
            return true;
        }
        return false;
    }

    /// Springs that give by more than a tenth of a width are made stiffer.
    bool stiffen() {
        const Eigen::MatrixXd curvature = posterior_.at(mode_).curvature;
        bool any = false;
        for (const LogPosterior::Beyond& one : posterior_.beyond(mode_)) {
            double& stiffness = posterior_.stiffness()[one.vector];
            const double pull = stiffness * one.distance;
            const double natural =
                std::max(one.outward.dot(curvature * one.outward) - stiffness, 0.0);
            const double scale = std::max(pull, std::sqrt(natural));
            if (one.distance * scale < 0.1 || stiffness > 1e16) continue;
            stiffness *= 100.0;
            any = true;
        }
        return any;
    }

    void name_unmeasured(const Relative& relative) {
        std::vector<std::string> names;
        for (Eigen::Index k = 0; k < relative.eigenvalues.size(); ++k)
            if (relative.eigenvalues[k] <= 0.0) names.push_back(name_of(relative.dual.col(k)));
        if (names.empty()) return;
        std::sort(names.begin(), names.end());
        names.erase(std::unique(names.begin(), names.end()), names.end());
        warnings_.push_back(
            fmt::format("The counts do not hold {}: the likelihood is not curved there, and "
                        "proposals of the "
                        "independence kernel are as wide as the prior. What is reported of {} "
                        "is the prior's.",
                        fmt::join(names, ", "),
                        names.size() == 1 ? "it" : "them"));
    }

    /// The parameter that weighs most in a direction, in units of its prior.
    std::string name_of(const Eigen::VectorXd& direction) const {
        const Eigen::VectorXd scaled =
            direction.cwiseQuotient(metric_.diagonal().cwiseSqrt()).cwiseAbs();
        Eigen::Index largest = 0;
        scaled.maxCoeff(&largest);
        Eigen::Index row = 0;
        parameters_.directions().col(largest).cwiseAbs().maxCoeff(&row);
        return parameters_.space().parameters()[static_cast<std::size_t>(row)].name;
    }

    const FreeParameters& parameters_;
    LogPosterior posterior_;
    Eigen::MatrixXd metric_;  ///< information of the priors
    Eigen::VectorXd mode_;
    Eigen::MatrixXd precision_;
    std::vector<std::string> warnings_;
};

Laplace::Laplace(const Counts& counts,
                 const ParameterSpace& space,
                 const Engines& engines,
                 std::uint64_t seed)
    : parameters_(counts, space) {
    if (parameters_.size() == 0) return;  // nothing is sampled
    Fit fit(counts, parameters_, engines);
    fit.climb();
    fit.give_way_to_bounds();
    mean_ = fit.mean();
    factor_ = fit.factor();
    warnings_ = fit.take_warnings();
    const Eigen::VectorXd inside = parameters_.inside();
    const double step = parameters_.longest_step(inside, mean_ - inside);
    if (step < 1.0) mean_ = inside + 0.999 * step * (mean_ - inside);
    turn_into_coordinates(seed);
}

Eigen::VectorXd Laplace::draw_inside(double scale, Stream& stream) const {
    Eigen::VectorXd standard(mean_.size());
    for (double& component : standard) component = normal(stream);
    const double u = uniform(stream);
    const Eigen::VectorXd step = scale * (factor_ * standard);
    const double longest = parameters_.longest_step(mean_, step);
    return mean_ + (longest < 1.0 ? longest * std::cbrt(u) : 1.0) * step;
}

void Laplace::turn_into_coordinates(std::uint64_t seed) {
    const Eigen::Index n = mean_.size();
    Eigen::MatrixXd draws(n, static_cast<Eigen::Index>(n_keyed_draws));
    Eigen::Index n_inside = 0;
    for (std::uint64_t draw = 0; draw < n_keyed_draws; ++draw) {
        Stream stream(seed, Purpose::laplace_draw, 0, draw, 0);
        Eigen::VectorXd standard(n);
        for (double& component : standard) component = normal(stream);
        const Eigen::VectorXd free = mean_ + factor_ * standard;
        if (parameters_.is_inside(free))
            draws.col(n_inside++) = parameters_.coordinates_at(free);
    }
    const ParameterSpace& space = parameters_.space();
    bool is_linear = true;
    for (std::size_t v = 0; v < space.vectors().size(); ++v)
        is_linear = is_linear && !std::holds_alternative<UniformAmplitudePrior>(
                                     space.vector_prior(v).kind());
    const double outside = 1.0 - static_cast<double>(n_inside) / n_keyed_draws;
    in_coordinates_ = {parameters_.coordinates_at(mean_), factor_};
    const bool enough = n_inside >= 20 * n;
    if ((is_linear && outside <= most_outside) || (is_linear && !enough)) return;
    if (!enough) {
        // Hardly a draw inside: those drawn back to the bounds.
        for (n_inside = 0; n_inside < draws.cols(); ++n_inside) {
            Stream stream(seed,
                          Purpose::laplace_draw,
                          0,
                          n_keyed_draws + static_cast<std::uint64_t>(n_inside),
                          0);
            draws.col(n_inside) = parameters_.coordinates_at(draw_inside(1.0, stream));
        }
    }
    const auto used = draws.leftCols(n_inside);
    in_coordinates_.mean = used.rowwise().mean();
    const Eigen::MatrixXd centred = used.colwise() - in_coordinates_.mean;
    const Eigen::MatrixXd covariance =
        centred * centred.transpose() / static_cast<double>(n_inside - 1);
    in_coordinates_.factor = covariance.llt().matrixL();
}

void Laplace::draw_start(Stream& stream, Eigen::Ref<Eigen::VectorXd> coordinates) const {
    coordinates = parameters_.coordinates_at(draw_inside(2.0, stream));
}

}  // namespace deviascope
