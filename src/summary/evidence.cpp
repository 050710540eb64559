// SPDX-License-Identifier: GPL-2.0-or-later
#include "deviascope/summary/evidence.h"

#include <algorithm>
#include <cmath>
#include <vector>

#include "deviascope/core/error.h"
#include "deviascope/core/parallel.h"
#include "ensemble/independence.h"
#include "summary/draw_moments.h"
#include "summary/log_mean.h"

namespace deviascope {
namespace {

constexpr double undefined = std::numeric_limits<double>::quiet_NaN();

double median(std::span<const double> values) {
    std::vector<double> sorted(values.begin(), values.end());
    const auto middle = sorted.begin() + std::ssize(sorted) / 2;
    std::nth_element(sorted.begin(), middle, sorted.end());
    return *middle;
}

/// Draws of a proposal, and ln(q / g) at each.
std::vector<double> proposal_ratios(const Target& target,
                                    const IndependenceProposal& proposal,
                                    std::uint64_t which,
                                    const EvidenceOptions& options) {
    Eigen::MatrixXd at(target.n_coordinates(), options.proposal_draws);
    parallel_for(static_cast<std::size_t>(at.cols()), options.threads, [&](std::size_t draw) {
        Stream stream(options.seed, Purpose::evidence, which, draw, 0);
        proposal.draw(stream, at.col(static_cast<Eigen::Index>(draw)).data());
    });
    const Eigen::VectorXd log_q = log_posterior_at(target, at, options.threads);
    std::vector<double> ratio(static_cast<std::size_t>(at.cols()));
    for (Eigen::Index draw = 0; draw < at.cols(); ++draw)
        ratio[static_cast<std::size_t>(draw)] =
            log_q[draw] - proposal.log_density(at.col(draw).data());
    return ratio;
}

/// Columns (row, replicate, walker) of some replicates, or of some rows where there is but one
/// replicate.
struct Half {
    std::vector<Eigen::Index> draw;
    Eigen::Index n_series = 0;
};

Half half_of(const CoordinateDraws& draws, bool second) {
    const bool by_rows = draws.n_replicates == 1;
    const Eigen::Index parts = by_rows ? draws.n_rows : draws.n_replicates;
    const Eigen::Index from = second ? parts / 2 : 0, to = second ? parts : parts / 2;
    Half half;
    for (Eigen::Index row = 0; row < draws.n_rows; ++row)
        for (Eigen::Index replicate = 0; replicate < draws.n_replicates; ++replicate) {
            const Eigen::Index part = by_rows ? row : replicate;
            if (part < from || part >= to) continue;
            for (Eigen::Index walker = 0; walker < draws.n_walkers; ++walker)
                half.draw.push_back((row * draws.n_replicates + replicate) * draws.n_walkers +
                                    walker);
        }
    half.n_series = draws.n_walkers * (by_rows ? 1 : to - from);
    return half;
}

/// Variance of the mean of some positive numbers, relative to its square.
double relative_variance(std::span<const double> values, double draws) {
    const double mean = mean_of(values, [](double x) { return x; });
    const double square =
        mean_of(values, [&](double x) { return (x / mean - 1.0) * (x / mean - 1.0); });
    return square / draws;
}

/// 1 / (s1 l / Z + s2), and l / Z times it: what the two means of the bridge are made of.
double against(double log_ratio, double log_z, double s1) {
    return 1.0 / (s1 * std::exp(log_ratio - log_z) + (1.0 - s1));
}
double towards(double log_ratio, double log_z, double s1) {
    return 1.0 / (s1 + (1.0 - s1) * std::exp(log_z - log_ratio));
}

template <class Term>
std::vector<double> terms(std::span<const double> ratios, double log_z, double s1, Term term) {
    std::vector<double> out;
    out.reserve(ratios.size());
    for (const double ratio : ratios) out.push_back(term(ratio, log_z, s1));
    return out;
}

LogEvidence bridge_between(std::span<const double> posterior,
                           Eigen::Index n_series,
                           std::span<const double> proposal) {
    const double n1 = effective_number(posterior, n_series);
    const auto n2 = static_cast<double>(proposal.size());
    const double s1 = n1 / (n1 + n2);
    LogEvidence found{bridge(posterior, proposal, s1), undefined};
    if (!std::isfinite(found.value)) return {};
    const std::vector<double> at_posterior = terms(posterior, found.value, s1, against);
    const std::vector<double> at_proposal = terms(proposal, found.value, s1, towards);
    found.error =
        std::sqrt(relative_variance(at_posterior, effective_number(at_posterior, n_series)) +
                  relative_variance(at_proposal, n2));
    return found;
}

/// The bridge over one half of the draws, with the proposal fitted to the other.
LogEvidence bridge_over(const Target& target,
                        const CoordinateDraws& draws,
                        bool second,
                        const EvidenceOptions& options) {
    const Half fitted = half_of(draws, !second), used = half_of(draws, second);
    const auto gaussian = gaussian_of(draws.coordinates(Eigen::all, fitted.draw));
    if (!gaussian) return {};
    const IndependenceProposal proposal(*gaussian);
    std::vector<double> posterior;
    posterior.reserve(used.draw.size());
    for (const Eigen::Index draw : used.draw)
        posterior.push_back(draws.log_posterior[draw] -
                            proposal.log_density(draws.coordinates.col(draw).data()));
    const std::vector<double> drawn =
        proposal_ratios(target, proposal, second ? 1 : 0, options);
    return bridge_between(posterior, used.n_series, drawn);
}

void add_importance(const Target& target, const EvidenceOptions& options, Evidence& evidence) {
    const CoordinateGaussian* gaussian = target.approximation();
    if (gaussian == nullptr) return;
    const std::vector<double> ratios =
        proposal_ratios(target, IndependenceProposal(*gaussian), 2, options);
    const LogMean mean = log_mean_exp(ratios, 1.0);
    evidence.importance = mean.estimate;
    evidence.importance_draws = mean.carrying;
}

Evidence of_a_point(const Target& target) {
    const Eigen::VectorXd value = log_posterior_at(target, Eigen::MatrixXd(0, 1), 1);
    return {{value[0], 0.0}, {value[0], 0.0}, undefined};
}

}  // namespace

double bridge(std::span<const double> posterior_ratios,
              std::span<const double> proposal_ratios,
              double posterior_share) {
    if (posterior_ratios.empty() || proposal_ratios.empty()) return undefined;
    if (std::ranges::none_of(proposal_ratios, [](double x) { return std::isfinite(x); }))
        return undefined;
    constexpr int most_rounds = 10000;
    constexpr double settled = 1e-13;
    double log_z = median(posterior_ratios);
    for (int round = 0; round < most_rounds; ++round) {
        const auto above = [&](double x) { return towards(x, log_z, posterior_share); };
        const auto below = [&](double x) { return against(x, log_z, posterior_share); };
        const double step =
            std::log(mean_of(proposal_ratios, above) / mean_of(posterior_ratios, below));
        log_z += step;
        if (std::abs(step) < settled) break;
    }
    return log_z;
}

CoordinateDraws coordinate_draws(const ParameterSpace& space, const Draws& draws) {
    ensure(draws.n_parameters == space.n_parameters(),
           "draws have the parameters of the space");
    CoordinateDraws out{draws.n_rows, draws.n_replicates, draws.n_walkers, {}, {}};
    const auto n = static_cast<Eigen::Index>(draws.log_posterior.size());
    out.coordinates.resize(space.n_coordinates(), n);
    out.log_posterior = Eigen::Map<const Eigen::VectorXd>(draws.log_posterior.data(), n);
    for (Eigen::Index draw = 0; draw < n; ++draw)
        out.coordinates.col(draw) = space.to_coordinates(
            Eigen::Map<const Eigen::VectorXd>(draws.row_of(0, 0, draw), space.n_parameters()));
    return out;
}

Evidence evidence_of(const Target& target,
                     const CoordinateDraws& draws,
                     const EvidenceOptions& options) {
    if (target.n_coordinates() == 0) return of_a_point(target);
    ensure(draws.size() > 0, "evidence is estimated from draws");
    const LogEvidence first = bridge_over(target, draws, false, options);
    const LogEvidence second = bridge_over(target, draws, true, options);
    Evidence evidence;
    evidence.bridge = {0.5 * (first.value + second.value),
                       0.5 * std::hypot(first.error, second.error)};
    add_importance(target, options, evidence);
    return evidence;
}

}  // namespace deviascope
