// SPDX-License-Identifier: GPL-2.0-or-later
#include "summary/log_mean.h"

#include <algorithm>
#include <cmath>

#include "deviascope/core/parallel.h"
#include "deviascope/ensemble/diagnostics.h"

namespace deviascope {

namespace {
constexpr double least_draws = 100.0;     // that must carry an estimate
constexpr Eigen::Index block_size = 256;  // walkers a call of the target
}  // namespace

Eigen::VectorXd log_posterior_at(const Target& target,
                                 const Eigen::MatrixXd& coordinates,
                                 int threads) {
    const Eigen::Index n = coordinates.cols();
    Eigen::VectorXd log_posterior(n);
    const auto n_blocks = static_cast<std::size_t>((n + block_size - 1) / block_size);
    parallel_for(n_blocks, threads, [&](std::size_t block) {
        const Eigen::Index first = static_cast<Eigen::Index>(block) * block_size;
        const Eigen::Index size = std::min(block_size, n - first);
        Eigen::VectorXd log_likelihood(size);
        target.log_density(coordinates.middleCols(first, size),
                           log_posterior.segment(first, size),
                           log_likelihood);
    });
    return log_posterior;
}

double effective_number(std::span<const double> values, Eigen::Index n_series) {
    const auto n = static_cast<Eigen::Index>(values.size());
    Eigen::MatrixXd chains(n / n_series, n_series);
    for (Eigen::Index i = 0; i < chains.size(); ++i)
        chains(i / n_series, i % n_series) = values[static_cast<std::size_t>(i)];
    const double bulk = effective_draws(chains).bulk;
    const auto all = static_cast<double>(n);
    return std::isfinite(bulk) ? std::min(bulk, all) : all;
}

LogMean log_mean_exp(std::span<const double> logs, double share_effective) {
    const double largest = *std::max_element(logs.begin(), logs.end());
    if (!std::isfinite(largest)) return {};
    const double mean = mean_of(logs, [&](double x) { return std::exp(x - largest); });
    const double square =
        mean_of(logs, [&](double x) { return std::exp(2.0 * (x - largest)); });
    const double draws = static_cast<double>(logs.size()) * share_effective;
    LogMean found;
    found.carrying = draws * mean * mean / square;
    if (found.carrying < least_draws) return found;
    const double variance = std::max(square / (mean * mean) - 1.0, 0.0);
    found.estimate = {largest + std::log(mean), std::sqrt(variance / draws)};
    return found;
}

}  // namespace deviascope
