// SPDX-License-Identifier: GPL-2.0-or-later
// CORE: the seam between model and ensemble
#pragma once

#include <Eigen/Core>
#include <cstdint>
#include <span>
#include <string>
#include <vector>

#include "deviascope/core/parameter.h"
#include "deviascope/core/random.h"

namespace deviascope {

/// A Gaussian in the coordinates of a target: N(mean, factor factor^T).
struct CoordinateGaussian {
    Eigen::VectorXd mean;    ///< n_coordinates
    Eigen::MatrixXd factor;  ///< n_coordinates x n_coordinates, lower triangular, diagonal > 0
};

/// How often a density was evaluated in one of several ways.
struct EvaluationCount {
    std::string way;
    std::int64_t times = 0;

    bool operator==(const EvaluationCount&) const = default;
};

/// A density to sample. The sampler knows no astronomy: it moves *coordinates* (n_coordinates
/// doubles a walker) and stores *parameters* (one row a walker).
///
/// All members are const, pure and may be called from several threads at once.
/// **Every result is a function of one walker's coordinates alone**: the same bits whether the
/// walker is evaluated alone, in a pair or in a full block.
class Target {
  public:
    virtual ~Target() = default;

    /// The stored columns, in order.
    virtual const std::vector<Parameter>& parameters() const = 0;
    /// The vectors among them.
    virtual const std::vector<VectorParameter>& vectors() const = 0;
    virtual Eigen::Index n_coordinates() const = 0;

    /// Log posterior density in the coordinates, and log likelihood, of a block of walkers.
    /// @param coordinates     n_coordinates x n_walkers, one walker a column
    /// @param log_posterior   n_walkers; -inf outside the prior's support (a value, not an
    /// error)
    /// @param log_likelihood  n_walkers; -inf where the posterior is -inf
    virtual void log_density(const Eigen::Ref<const Eigen::MatrixXd>& coordinates,
                             Eigen::Ref<Eigen::VectorXd> log_posterior,
                             Eigen::Ref<Eigen::VectorXd> log_likelihood) const = 0;

    /// The parameters of a block of walkers; entries whose role is `redrawn` are NaN.
    /// @param parameters  n_parameters x n_walkers
    virtual void to_parameters(const Eigen::Ref<const Eigen::MatrixXd>& coordinates,
                               Eigen::Ref<Eigen::MatrixXd> parameters) const = 0;

    /// Draws the `redrawn` parameters of a block from their exact conditional given the rest.
    /// @param streams     n_walkers, one a column; each column uses its own only
    /// @param parameters  n_parameters x n_walkers, as filled by to_parameters
    virtual void redraw(std::span<Stream> streams,
                        Eigen::Ref<Eigen::MatrixXd> parameters) const = 0;

    /// One attempt at a starting point, over-dispersed about the expected posterior. It may lie
    /// outside the support; the caller tries again with the next attempt's stream.
    virtual void draw_start(Stream& stream, Eigen::Ref<Eigen::VectorXd> coordinates) const = 0;

    /// A Gaussian that stands for the target in the independence kernel; null where the target
    /// offers none. Fixed: the same at every call.
    virtual const CoordinateGaussian* approximation() const { return nullptr; }

    /// How often `log_density` was answered in each of the target's ways, since it was made;
    /// empty where there is only one. What is counted depends on the walkers asked for alone.
    virtual std::vector<EvaluationCount> evaluations() const { return {}; }

    /// What is doubtful about the target before any step, in plain words.
    virtual std::vector<std::string> warnings() const { return {}; }
};

}  // namespace deviascope
