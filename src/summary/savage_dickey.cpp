// SPDX-License-Identifier: GPL-2.0-or-later
#include <Eigen/Cholesky>
#include <algorithm>
#include <cmath>
#include <numbers>
#include <optional>
#include <vector>

#include "deviascope/summary/evidence.h"
#include "summary/draw_moments.h"
#include "summary/log_mean.h"

namespace deviascope {
namespace {

/// Vectors whose priors differ; nothing where the two have other vectors altogether.
std::optional<std::vector<std::size_t>> differing_vectors(const ParameterSpace& wide,
                                                          const ParameterSpace& narrow) {
    if (wide.vectors().size() != narrow.vectors().size()) return std::nullopt;
    std::vector<std::size_t> differing;
    for (std::size_t v = 0; v < wide.vectors().size(); ++v) {
        if (wide.vectors()[v].name != narrow.vectors()[v].name) return std::nullopt;
        if (wide.vector_prior(v) == narrow.vector_prior(v)) continue;
        if (wide.vector_prior(v).n_coordinates() == 0) return std::nullopt;
        differing.push_back(v);
    }
    if (differing.empty()) return std::nullopt;
    return differing;
}

/// Normal density about the draws of the tested coordinates, narrower than they are so that
/// its ratio to the posterior stays bounded, and the regression of the others on them.
class Ridge {
  public:
    Ridge(const DrawMoments& moments,
          const std::vector<Eigen::Index>& tested,
          const std::vector<Eigen::Index>& others)
        : mean_(moments.mean(tested)), covariance_(moments.covariance(tested, tested)) {
        regression_ = moments.covariance(tested, others);
        // Eigen takes the address of a right side's first element, even where there is none.
        if (!others.empty()) regression_ = covariance_.llt().solve(regression_).eval();
        factor_.compute(narrowed * covariance_);
        const Eigen::MatrixXd lower = factor_.matrixL();
        log_normalisation_ =
            -0.5 * static_cast<double>(mean_.size()) * std::log(2.0 * std::numbers::pi) -
            lower.diagonal().array().log().sum();
    }

    double log_density(const Eigen::VectorXd& at) const {
        return log_normalisation_ - 0.5 * factor_.matrixL().solve(at - mean_).squaredNorm();
    }
    /// By how much the others move where the tested ones move by `step`.
    Eigen::VectorXd carried(const Eigen::VectorXd& step) const {
        return regression_.transpose() * step;
    }

  private:
    static constexpr double narrowed = 0.8;
    Eigen::VectorXd mean_;
    Eigen::MatrixXd covariance_, regression_;
    Eigen::LLT<Eigen::MatrixXd> factor_;
    double log_normalisation_ = 0.0;
};

std::vector<Eigen::Index> coordinates_of(const ParameterSpace& space,
                                         const std::vector<std::size_t>& vectors) {
    std::vector<Eigen::Index> places;
    for (const std::size_t v : vectors)
        for (Eigen::Index i = 0; i < space.vector_prior(v).n_coordinates(); ++i)
            places.push_back(space.vector_places()[v].coordinate + i);
    return places;
}

std::vector<Eigen::Index> all_but(const std::vector<Eigen::Index>& left_out, Eigen::Index n) {
    std::vector<Eigen::Index> rest;
    for (Eigen::Index i = 0; i < n; ++i)
        if (std::find(left_out.begin(), left_out.end(), i) == left_out.end()) rest.push_back(i);
    return rest;
}

}  // namespace

std::optional<TestedPoints> tested_points(const ParameterSpace& wide,
                                          const ParameterSpace& narrow,
                                          Eigen::Index n_draws,
                                          std::uint64_t seed) {
    const auto vectors = differing_vectors(wide, narrow);
    if (!vectors) return std::nullopt;
    TestedPoints points{coordinates_of(wide, *vectors), {}, Eigen::VectorXd::Zero(n_draws)};
    points.at.resize(std::ssize(points.coordinate), n_draws);
    for (Eigen::Index draw = 0; draw < n_draws; ++draw) {
        Stream stream(seed, Purpose::evidence, 3, static_cast<std::uint64_t>(draw), 0);
        Eigen::Index first = 0;
        for (const std::size_t v : *vectors) {
            const VectorPrior& prior = wide.vector_prior(v);
            const Eigen::VectorXd at =
                prior.coordinates_of(narrow.vector_prior(v).draw(stream));
            points.at.block(first, draw, at.size(), 1) = at;
            points.log_density[draw] += prior.log_density(at);
            first += at.size();
        }
        if (!std::isfinite(points.log_density[draw])) return std::nullopt;
    }
    return points;
}

LogEvidence savage_dickey(const Target& wide,
                          const CoordinateDraws& draws,
                          const TestedPoints& points,
                          const EvidenceOptions& options) {
    const auto gaussian = gaussian_of(draws.coordinates);
    if (!gaussian) return {};
    const std::vector<Eigen::Index>& tested = points.coordinate;
    const std::vector<Eigen::Index> others = all_but(tested, wide.n_coordinates());
    const Ridge ridge(moments_of(draws.coordinates), tested, others);

    Eigen::MatrixXd moved = draws.coordinates;
    std::vector<double> logs(static_cast<std::size_t>(draws.size()));
    for (Eigen::Index draw = 0; draw < draws.size(); ++draw) {
        const Eigen::VectorXd from = draws.coordinates(tested, draw), to = points.at.col(draw);
        moved(tested, draw) = to;
        moved(others, draw) += ridge.carried(to - from);
        logs[static_cast<std::size_t>(draw)] =
            ridge.log_density(from) - draws.log_posterior[draw] - points.log_density[draw];
    }
    const Eigen::VectorXd log_q = log_posterior_at(wide, moved, options.threads);
    for (std::size_t draw = 0; draw < logs.size(); ++draw)
        logs[draw] += log_q[static_cast<Eigen::Index>(draw)];
    const double share = effective_number(logs, draws.n_replicates * draws.n_walkers) /
                         static_cast<double>(logs.size());
    return log_mean_exp(logs, share).estimate;
}

}  // namespace deviascope
