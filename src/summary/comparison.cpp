// SPDX-License-Identifier: GPL-2.0-or-later
#include "deviascope/summary/comparison.h"

#include <fmt/format.h>

#include <algorithm>
#include <cmath>

#include "deviascope/core/random.h"
#include "summary/rounding.h"

namespace deviascope {
namespace {

constexpr double undecided_below = 1.0, strong_from = 3.0, very_strong_from = 5.0;
constexpr double poorly_known = 0.3;  // error of a ln evidence
constexpr double disagreement = 4.0;  // of two estimates, in their errors
constexpr double least_error = 0.02;  // below which they are not asked to agree

using Warnings = std::vector<std::string>;

void warn_of_runs(const Comparison& all, Warnings& warnings) {
    std::string names;
    const auto add = [&](const std::string& name, bool converged) {
        if (!converged) names += (names.empty() ? "" : ", ") + name;
    };
    for (const HypothesisResult& one : all.hypotheses) add(one.name, one.converged);
    for (const SurveyFit& one : all.alone) add(one.name + " alone", one.converged);
    for (const SurveyFit& one : all.without) add("without " + one.name, one.converged);
    if (names.empty()) return;
    warnings.push_back("Runs that did not converge, whose numbers are not to be trusted: " +
                       names + ". Raise ensemble.max_steps.");
}

/// Two estimates of one ln evidence further apart than their errors allow.
void warn_of_disagreement(const HypothesisResult& one,
                          const char* other_name,
                          const LogEvidence& other,
                          Warnings& warnings) {
    const LogEvidence& bridge = one.evidence.bridge;
    if (std::isnan(bridge.value) || std::isnan(other.value)) return;
    const double error = std::max(std::hypot(bridge.error, other.error), least_error);
    if (std::abs(bridge.value - other.value) <= disagreement * error) return;
    warnings.push_back(fmt::format(
        "{}: ln evidence by bridge sampling ({:.2f}) and {} ({:.2f}) differ by {:.1f} "
        "of their errors; do not quote it.",
        one.name,
        bridge.value,
        other_name,
        other.value,
        std::abs(bridge.value - other.value) / error));
}

void warn_of_evidence(const Comparison& all, Warnings& warnings) {
    for (const HypothesisResult& one : all.hypotheses) {
        if (std::isnan(one.evidence.bridge.value))
            warnings.push_back(one.name + ": no evidence could be computed from its draws.");
        else if (one.evidence.bridge.error > poorly_known)
            warnings.push_back(fmt::format("{}: its ln evidence is known to {:.2f} only.",
                                           one.name,
                                           one.evidence.bridge.error));
        warn_of_disagreement(one, "importance sampling", one.evidence.importance, warnings);
        warn_of_disagreement(one, "Savage-Dickey", one.savage_dickey, warnings);
    }
}

/// Whether the grade between a hypothesis and the best changes where a prior is three times
/// wider or narrower.
void warn_of_prior_width(const Comparison& all, Warnings& warnings) {
    if (all.hypotheses.empty()) return;
    const HypothesisResult& best = all.hypotheses[best_hypothesis(all.hypotheses)];
    const auto check = [&](const HypothesisResult& one,
                           double with,
                           double without,
                           const PriorWidth& width) {
        if (std::isnan(width.log_evidence.value) || grade_of(with) == grade_of(without)) return;
        warnings.push_back(fmt::format(
            "{}: with the {} prior {} the evidence against {} goes from {} to {}; quote the "
            "Bayes factor with its prior only.",
            one.name,
            width.vector,
            width.factor > 1.0 ? "three times wider" : "three times narrower",
            best.name,
            grade_of(without),
            grade_of(with)));
    };
    for (const HypothesisResult& one : all.hypotheses) {
        const double apart = best.evidence.bridge.value - one.evidence.bridge.value;
        if (&one == &best || std::isnan(apart)) continue;
        for (const PriorWidth& width : one.prior_width)
            check(one, best.evidence.bridge.value - width.log_evidence.value, apart, width);
        for (const PriorWidth& width : best.prior_width)
            check(one, width.log_evidence.value - one.evidence.bridge.value, apart, width);
    }
}

std::string dispersion_words(const FitCheck& check) {
    const double error_ratio = std::sqrt(check.dispersion / check.assumed_dispersion);
    return fmt::format(
        "{}/{} is {} by {:.3f} +- {:.3f}{}: the errors here are too {} by about {:.0f} %. In "
        "the job file: dispersion = {:.3g}",
        check.survey,
        check.bin,
        is_over_dispersed(check) ? "over-dispersed" : "under-dispersed",
        check.dispersion,
        check.dispersion_sd,
        check.assumed_dispersion == 1.0
            ? ""
            : fmt::format(" (the job says {:.3g})", check.assumed_dispersion),
        is_over_dispersed(check) ? "small" : "large",
        100.0 * std::abs(error_ratio - 1.0),
        check.dispersion);
}

void warn_of_fit(const Comparison& all, Warnings& warnings) {
    constexpr double unlikely = 1e-3;
    for (const FitCheck& check : all.fit) {
        if (is_over_dispersed(check) || is_under_dispersed(check))
            warnings.push_back(dispersion_words(check) + ".");
        for (const ResidualPower& power : check.power)
            if (power.probability < unlikely)
                warnings.push_back(fmt::format(
                    "{}/{}: the residuals hold more power in multipole {} than Poisson counts "
                    "have on this sky (p = {:.1g}): a structure that the model lacks.",
                    check.survey,
                    check.bin,
                    power.multipole,
                    power.probability));
    }
}

void warn_of_surveys(const Comparison& all, Warnings& warnings) {
    constexpr double doubtful_sigma = 3.0;
    if (all.consistency.sigma >= doubtful_sigma)
        warnings.push_back(fmt::format(
            "The surveys disagree about the velocity at {:.1f} sigma: a joint posterior means "
            "little before the reason is known.",
            all.consistency.sigma));
}

void warn_of_overlap(const Comparison& all, Warnings& warnings) {
    constexpr double noticeable = 5.0;
    for (const SurveyOverlap& one : all.overlap) {
        const auto matches = static_cast<double>(one.matches.value_or(0));
        if (matches <=
            one.expected_by_chance + noticeable * std::sqrt(one.expected_by_chance + 1.0))
            continue;
        warnings.push_back(fmt::format(
            "{} and {} share sources, which count twice in the joint posterior: {:.0f} within "
            "{:g} arcsec, {} expected by chance. In the job file: deduplicate = [ \"{} over "
            "{}\" ].",
            one.first,
            one.second,
            matches,
            one.match_arcsec,
            short_number(one.expected_by_chance),
            one.first,
            one.second));
    }
}

}  // namespace

double chance_of_length(const VectorPrior& prior,
                        const Eigen::Matrix3Xd& vectors,
                        std::uint64_t seed) {
    constexpr std::uint64_t n_draws = 100000;
    std::vector<double> length(n_draws);
    for (std::uint64_t draw = 0; draw < n_draws; ++draw) {
        Stream stream(seed, Purpose::prior_draw, 1, draw, 0);
        length[draw] = prior.draw(stream).norm();
    }
    std::ranges::sort(length);
    double sum = 0.0;
    for (Eigen::Index draw = 0; draw < vectors.cols(); ++draw)
        sum += static_cast<double>(length.end() -
                                   std::ranges::lower_bound(length, vectors.col(draw).norm()));
    return sum / static_cast<double>(n_draws) / static_cast<double>(vectors.cols());
}

std::size_t best_hypothesis(const std::vector<HypothesisResult>& hypotheses) {
    std::size_t best = 0;
    for (std::size_t i = 0; i < hypotheses.size(); ++i) {
        const double value = hypotheses[i].evidence.bridge.value;
        const double largest = hypotheses[best].evidence.bridge.value;
        if (value > largest || (std::isnan(largest) && !std::isnan(value))) best = i;
    }
    return best;
}

std::string grade_of(double log_bayes_factor) {
    if (std::isnan(log_bayes_factor)) return "unknown";
    if (log_bayes_factor < undecided_below) return "undecided";
    if (log_bayes_factor < strong_from) return "positive";
    return log_bayes_factor < very_strong_from ? "strong" : "very strong";
}

std::vector<std::string> cautions_of(const Comparison& comparison) {
    Warnings warnings;
    warn_of_runs(comparison, warnings);
    warn_of_surveys(comparison, warnings);
    warn_of_fit(comparison, warnings);
    warn_of_evidence(comparison, warnings);
    warn_of_prior_width(comparison, warnings);
    warn_of_overlap(comparison, warnings);
    return warnings;
}

}  // namespace deviascope
