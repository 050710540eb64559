// SPDX-License-Identifier: GPL-2.0-or-later
#include "summary/cautions.h"
#include "deviascope/core/grouped_number.h"

#include <fmt/format.h>
#include <Eigen/LU>

#include <algorithm>
#include <cmath>

#include "ensemble/looks.h"
#include "summary/rounding.h"
#include "summary/vector_words.h"

namespace deviascope {
namespace {

constexpr double least_acceptance = 0.05;
constexpr double few_effective_draws = 1000.0;
/// Posterior as wide as this share of the prior: the counts hardly speak.
constexpr double prior_wide = 0.8;
/// A posterior whose 95 % interval ends above this share of a prior's range leans on its edge.
constexpr double edge_share = 0.95;
/// 95.45 % quantile of chi-squared with 3 degrees of freedom (scipy.stats.chi2).
constexpr double chi_squared_95 = 8.024881760;

// ---- sampling ----

/// The scalar for which `worse` says so against all others; null where none is defined.
template <class Value>
const ScalarDiagnostics* largest(const SamplingSummary& sampling, Value value) {
    const ScalarDiagnostics* worst = nullptr;
    for (const ScalarDiagnostics& scalar : sampling.scalars)
        if (!std::isnan(value(scalar)) && (!worst || value(scalar) > value(*worst)))
            worst = &scalar;
    return worst;
}

/// What the stopping rule still lacked, scalar by scalar kind of failure.
std::vector<std::string> shortfalls_of(const SamplingSummary& sampling, double wanted_draws) {
    const LookRule rule = stopping_rule(wanted_draws);
    using S = ScalarDiagnostics;
    const S* walker = largest(sampling, [](const S& s) { return s.walker_rhat; });
    const S* replicate = largest(sampling, [](const S& s) { return s.replicate_rhat; });
    const S* draws = largest(sampling, [](const S& s) { return -s.effective_draws(); });
    std::vector<std::string> lacks;
    if (walker && !(walker->walker_rhat < rule.walker_rhat_below))
        lacks.push_back(fmt::format("walker R-hat {:.3f} of {} (wanted below {})",
                                    walker->walker_rhat,
                                    walker->name,
                                    rule.walker_rhat_below));
    if (replicate && !(replicate->replicate_rhat < rule.replicate_rhat_below))
        lacks.push_back(fmt::format("replicate R-hat {:.3f} of {} (wanted below {})",
                                    replicate->replicate_rhat,
                                    replicate->name,
                                    rule.replicate_rhat_below));
    if (draws && draws->effective_draws() < rule.effective_draws_at_least)
        lacks.push_back(fmt::format("{} effective draws of {} ({} wanted)",
                                    short_number(std::floor(draws->effective_draws())),
                                    draws->name,
                                    short_number(rule.effective_draws_at_least)));
    return lacks;
}

std::string why_it_ended(const Outcome& outcome) {
    switch (outcome.end) {
        case Outcome::End::max_steps:
            return fmt::format("the sampler reached max_steps ({} a walker)",
                               grouped(outcome.steps));
        case Outcome::End::interrupted:
            return "the sampler was interrupted";
        default:
            return "the sampler has not finished";
    }
}

std::string joined(const std::vector<std::string>& parts) {
    return fmt::format("{}", fmt::join(parts, "; "));
}

void add_sampling(const Summary& summary,
                  const SummaryOptions& options,
                  std::vector<std::string>& cautions) {
    const SamplingSummary& sampling = summary.sampling;
    if (!sampling.converged) {
        std::string text = fmt::format(
            "Not converged: {} before its stopping rule was met. Do not quote these numbers.",
            why_it_ended(sampling.outcome));
        const auto lacks = shortfalls_of(sampling, options.effective_draws_wanted);
        if (!lacks.empty()) text += " Still lacking: " + joined(lacks) + ".";
        cautions.push_back(text);
    }
    if (!sampling.outcome.warm_up_settled)
        cautions.emplace_back(
            "The warm-up did not settle: walkers still disagreed when half of max_steps was "
            "used up. Draws may remember where the walkers started.");
    if (sampling.effective_draws_min < few_effective_draws)
        cautions.push_back(fmt::format(
            "Few effective draws ({}): an end of a 95 % interval is uncertain by about {:.2f} "
            "standard deviations.",
            short_number(std::floor(sampling.effective_draws_min)),
            // sqrt(p (1 - p) / n) over the normal density at the 2.275 % quantile
            2.762 / std::sqrt(sampling.effective_draws_min)));
    for (std::size_t kernel = 0; kernel < n_kernels; ++kernel) {
        const auto tried = static_cast<double>(sampling.outcome.tally.tried[kernel]);
        const auto taken = static_cast<double>(sampling.outcome.tally.taken[kernel]);
        if (tried > 0.0 && taken < least_acceptance * tried)
            cautions.push_back(
                fmt::format("The {} kernel had only {:.1f} % of its proposals taken: it moved "
                            "hardly any walker.",
                            name_of(static_cast<Kernel>(kernel)),
                            100.0 * taken / tried));
    }
}

void add_engine(const Summary& summary,
                const ParameterSpace& space,
                std::vector<std::string>& cautions) {
    const SamplingSummary& sampling = summary.sampling;
    if (space.options().engine.engine != Engine::moment || sampling.pixel_evaluations == 0)
        return;
    cautions.push_back(fmt::format(
        "The job asks for the moment engine, but the pixel engine had to answer {} of {} "
        "evaluations: the series' error could not be kept below the tolerance there.",
        grouped(sampling.pixel_evaluations),
        grouped(sampling.pixel_evaluations + sampling.moment_evaluations)));
}

// ---- separation ----

void add_separation(const Separation& separation, std::vector<std::string>& cautions) {
    if (!separation.joint.velocity_prior_share) return;
    const double share = *separation.joint.velocity_prior_share;
    if (share < 0.1) return;
    const std::string advice =
        share < 0.5 ? "Quote the priors with every amplitude."
                    : "Neither amplitude is a measurement; only their combination in the bins "
                      "is. Bins with unlike kinematic weights would separate them.";
    cautions.push_back(
        fmt::format("Velocity and intrinsic dipole are {} ({:.0f} % of the "
                    "velocity comes from priors). {}",
                    separation.joint.verdict,
                    100.0 * share,
                    advice));
}

// ---- vectors and their priors ----

/// Geometric mean of posterior over prior standard deviation, in the free coordinates.
double width_against_prior(const VectorSummary& vector, const VectorPrior& prior) {
    if (const auto* along = std::get_if<AxisPrior>(&prior.kind()))
        return std::sqrt(along->axis.dot(vector.covariance * along->axis) /
                         along->axis.dot(prior.covariance() * along->axis));
    return std::pow(vector.covariance.determinant() / prior.covariance().determinant(),
                    1.0 / 6.0);
}

/// Largest amplitude a prior allows; 1 is the wall of every vector.
double edge_of(const VectorPrior& prior) {
    const auto& kind = prior.kind();
    if (const auto* flat = std::get_if<UniformVectorPrior>(&kind)) return flat->max;
    if (const auto* even = std::get_if<UniformAmplitudePrior>(&kind)) return even->max;
    if (const auto* along = std::get_if<AxisPrior>(&kind)) return along->max;
    return 1.0;
}

/// A density that is smooth at zero has the factor r^2 in the amplitude.
bool has_volume_factor(const VectorPrior& prior) {
    const auto* gaussian = std::get_if<GaussianPrior>(&prior.kind());
    return std::holds_alternative<UniformVectorPrior>(prior.kind()) ||
           (gaussian && gaussian->mean.isZero(0.0));
}

/// Priors that are themselves a measurement are meant to rule.
bool is_measurement(const VectorPrior& prior) {
    const auto* gaussian = std::get_if<GaussianPrior>(&prior.kind());
    return gaussian && !gaussian->mean.isZero(0.0);
}

void add_vector(const VectorSummary& vector,
                const VectorPrior& prior,
                std::vector<std::string>& cautions) {
    const std::string name = "the " + name_of(vector);
    if (vector.draws_without_direction > 0)
        cautions.push_back(fmt::format(
            "{} draws of {} have length zero and no direction; they are left out of directions "
            "and regions.",
            grouped(vector.draws_without_direction),
            name));
    if (!vector.amplitude_free || is_measurement(prior)) return;
    if (width_against_prior(vector, prior) > prior_wide) {
        cautions.push_back(fmt::format(
            "The counts say little about {}: its posterior is nearly as wide as its prior {}. "
            "The amplitude is that of the prior.",
            name,
            vector.prior));
        return;
    }
    if (vector.amplitude.interval95[1] > edge_share * edge_of(prior))
        cautions.push_back(
            fmt::format("The posterior of {} leans on the edge of its prior {} (at {:g}): the "
                        "edge cuts off its amplitude.",
                        name,
                        vector.prior,
                        edge_of(prior)));
    if (vector.amplitude_limits)
        cautions.push_back(
            fmt::format("No detection of {}: the density of its amplitude stands high at zero. "
                        "Quote its upper limit, below which 95.45 % of the draws lie: {}.",
                        name,
                        limit_in_words(vector)));
    if (vector.amplitude_limits || !has_volume_factor(prior)) return;
    const double chi_squared = vector.mean.dot(vector.covariance.inverse() * vector.mean);
    if (chi_squared < chi_squared_95)
        cautions.push_back(fmt::format(
            "No detection of {}: a vector of zero lies inside its 95 % region (chi-squared "
            "{:.1f} for 3 components). The amplitude is above zero by its volume factor r^2 "
            "alone: read the upper end of its interval as a limit.",
            name,
            chi_squared));
}

// ---- bins and earlier stages ----

void add_dispersions(const Summary& summary,
                     const ParameterSpace& space,
                     std::vector<std::string>& cautions) {
    std::vector<std::string> bins;
    for (std::size_t bin = 0; bin < space.terms().size(); ++bin)
        if (space.terms()[bin].dispersion != 1.0)
            bins.push_back(fmt::format("{} {} by {:.4g}",
                                       summary.bins[bin].survey,
                                       summary.bins[bin].bin,
                                       space.terms()[bin].dispersion));
    if (!bins.empty())
        cautions.push_back(
            "Counts scatter more (or less) than Poisson: log-likelihoods are divided by a "
            "dispersion (" +
            joined(bins) + "). It scales the errors and explains nothing.");
}

void add_carried(const Summary& summary,
                 const SummaryOptions& options,
                 std::vector<std::string>& cautions) {
    const auto add_new = [&](const std::string& text) {
        if (std::find(cautions.begin(), cautions.end(), text) == cautions.end())
            cautions.push_back(text);
    };
    for (std::size_t survey = 0; survey < summary.cuts.size(); ++survey)
        for (const std::string& text : summary.cuts[survey].warnings)
            add_new(summary.survey_names[survey] + ": " + text);
    for (const std::string& text : options.job_warnings) add_new(text);
}

}  // namespace

std::vector<std::string> cautions_of(const Summary& summary,
                                     const ParameterSpace& space,
                                     const SummaryOptions& options) {
    std::vector<std::string> cautions;
    add_sampling(summary, options, cautions);
    add_engine(summary, space, cautions);
    add_separation(summary.separation, cautions);
    add_vector(summary.velocity, space.vector_prior(0), cautions);
    for (std::size_t v = 0; v < summary.intrinsic.size(); ++v)
        add_vector(summary.intrinsic[v], space.vector_prior(v + 1), cautions);
    add_dispersions(summary, space, cautions);
    add_carried(summary, options, cautions);
    return cautions;
}

}  // namespace deviascope
