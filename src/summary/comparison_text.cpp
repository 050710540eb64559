// SPDX-License-Identifier: GPL-2.0-or-later
#include <fmt/format.h>

#include <algorithm>
#include <array>
#include <cmath>

#include "deviascope/core/grouped_number.h"
#include "deviascope/core/physical_constants.h"
#include "deviascope/summary/comparison.h"
#include "summary/rounding.h"
#include "summary/text_table.h"

namespace deviascope {
namespace {

constexpr double thousandth = 1e-3;

std::string plain(double value, const char* form) {
    return std::isnan(value) ? "-" : fmt::format(fmt::runtime(form), value);
}

std::string sigma(double value) {
    return plain(value, "{:.1f}");
}

std::string probability(double value) {
    return plain(value, "{:.2g}");
}

/// Two decimals, three where the error is known so well.
std::string with_error(const LogEvidence& found) {
    if (std::isnan(found.value)) return "-";
    if (!(found.error > 0.0)) return fmt::format("{:.3f}", found.value);
    return found.error < 0.005 ? fmt::format("{:.3f} +- {:.3f}", found.value, found.error)
                               : fmt::format("{:.2f} +- {:.2f}", found.value, found.error);
}

/// A probability counted in 100,000 draws for each draw of a posterior.
std::string rare(double value) {
    return value < 1e-5 ? "< 1e-5" : probability(value);
}

/// `412 (380 to 440)`.
std::string with_interval(const ScalarEstimate& estimate) {
    const double uncertainty = half_width(estimate.interval68);
    return fmt::format("{} ({})",
                       rounded(estimate.median, uncertainty),
                       rounded(estimate.interval68, uncertainty));
}

std::string speed(const SurveyFit& fit) {
    return with_interval(in_unit(fit.speed, 1.0 / speed_of_light_km_s));
}

// ---- reference ----

std::string shift(const VelocityOffset& offset) {
    return fmt::format("{}{}", offset.shift_is_limit ? "> " : "", sigma(offset.shift_sigma));
}

std::string offset_block(const Comparison& all) {
    std::string text = heading("Against the velocity of " + all.reference);
    TextTable table("lrrrrr");
    table.row({"", "speed (km/s)", "angle (deg)", "ratio of speeds", "chi2 (3)", "sigma"});
    const auto add = [&](const std::string& name, const SurveyFit& fit) {
        table.row({name,
                   speed(fit),
                   with_interval(fit.offset.angle_deg),
                   with_interval(fit.offset.speed_ratio),
                   plain(fit.offset.chi2, "{:.2f}"),
                   sigma(fit.offset.sigma)});
    };
    for (const SurveyFit& fit : all.alone) add(fit.name, fit);
    if (all.alone.size() > 2)
        for (const SurveyFit& fit : all.without) add("without " + fit.name, fit);
    add("joint", all.joint);
    text += table.text();
    text +=
        folded(fmt::format("From the draws, without taking them for Gaussian (Raveri & Doux "
                           "2021), joint: {} sigma. Angles and ratios are medians "
                           "with 68 % intervals, against draws from the reference.",
                           shift(all.joint.offset)),
               0);
    return text;
}

// ---- hypotheses ----

std::string verdict(const Comparison& all) {
    const HypothesisResult& best = all.hypotheses[best_hypothesis(all.hypotheses)];
    if (std::isnan(best.evidence.bridge.value)) return "No evidence could be computed.";
    std::string rivals, rejected;
    for (const HypothesisResult& one : all.hypotheses) {
        if (&one == &best) continue;
        const std::string grade =
            grade_of(best.evidence.bridge.value - one.evidence.bridge.value);
        std::string& list = grade == "undecided" ? rivals : rejected;
        list += (list.empty() ? "" : ", ") +
                (grade == "undecided" ? one.name : fmt::format("{} ({})", one.name, grade));
    }
    std::string text = rivals.empty()
                           ? fmt::format("The counts speak for {}.", best.name)
                           : fmt::format("Undecided between {} and {}.", best.name, rivals);
    if (!rejected.empty()) text += fmt::format(" Evidence against: {}.", rejected);
    return text;
}

std::string width_text(const HypothesisResult& one, const char* vector, bool wider) {
    for (const PriorWidth& width : one.prior_width)
        if (width.vector == vector && (width.factor > 1.0) == wider)
            return plain(width.log_evidence.value - one.evidence.bridge.value, "{:+.2f}");
    return "";
}

std::string width_table(const Comparison& all) {
    TextTable table("lrrrr");
    table.row({"ln evidence changes by, with",
               "velocity prior / 3",
               "x 3",
               "intrinsic prior / 3",
               "x 3"});
    for (const HypothesisResult& one : all.hypotheses)
        table.row({one.name,
                   width_text(one, "velocity", false),
                   width_text(one, "velocity", true),
                   width_text(one, "intrinsic", false),
                   width_text(one, "intrinsic", true)});
    return table.text();
}

std::string hypotheses_block(const Comparison& all) {
    std::string text = heading("Hypotheses");
    TextTable priors("lll");
    priors.row({"", "velocity", "intrinsic dipole"});
    for (const HypothesisResult& one : all.hypotheses)
        priors.row({one.name, one.velocity, one.intrinsic});
    TextTable table("lrrrr");
    table.row({"", "ln evidence", "ln Bayes factor", "Savage-Dickey", "importance"});
    const double best = all.hypotheses[best_hypothesis(all.hypotheses)].evidence.bridge.value;
    for (const HypothesisResult& one : all.hypotheses)
        table.row({one.name,
                   with_error(one.evidence.bridge),
                   plain(one.evidence.bridge.value - best, "{:.2f}"),
                   with_error(one.savage_dickey),
                   with_error(one.evidence.importance)});
    for (const std::string& part : {priors.text(), table.text(), width_table(all)}) {
        text += part;
        text += '\n';
    }
    text += folded(verdict(all), 0);
    text += folded(
        "Evidence by bridge sampling (Meng & Wong 1996), relative to the isotropic sky; a "
        "constant that improper priors of monopoles leave open is common to all and cancels. "
        "Grades: Kass & Raftery 1995 (undecided below 1 in ln, positive below 3, strong below "
        "5). A Bayes factor holds for its priors: their widths are part of the hypotheses.",
        0);
    return text;
}

std::string intrinsic_block(const Comparison& all) {
    std::string text =
        heading(fmt::format("Intrinsic dipole, if the velocity is that of {}", all.reference));
    TextTable table("lrrrr");
    table.row({"10^-3",
               "median (68 %)",
               "95 % interval",
               "median of the prior",
               all.clustering.empty() ? "" : "p of " + all.clustering});
    for (const IntrinsicAtReference& one : all.intrinsic) {
        const ScalarEstimate amplitude = in_unit(one.amplitude, thousandth);
        table.row({one.name == "all" ? "one for all surveys" : one.name,
                   with_interval(amplitude),
                   rounded(amplitude.interval95, half_width(amplitude.interval68)),
                   short_number(one.prior_median_amplitude / thousandth),
                   one.clustering_probability ? rare(*one.clustering_probability) : ""});
    }
    text += table.text();
    if (!all.clustering.empty())
        text += folded(
            fmt::format("p: how often a dipole drawn from {} is as long.", all.clustering), 0);
    return text;
}

// ---- surveys ----

std::string consistency_words(const Comparison& all) {
    const Consistency& found = all.consistency;
    if (found.n_surveys < 2)
        return "Fewer than two surveys hold the velocity by themselves: nothing to compare.";
    return fmt::format(
        "The {} surveys that hold the velocity by themselves: chi2 {:.2f} for {:.0f} degrees "
        "of "
        "freedom, p = {:.2g}, {:.1f} sigma; ln of the suspiciousness (Handley & Lemos 2019) "
        "{:.2f}{}.",
        found.n_surveys,
        found.chi2,
        found.degrees,
        found.probability,
        found.sigma,
        found.ln_suspiciousness,
        std::isnan(all.ln_suspiciousness_from_evidence)
            ? ""
            : fmt::format(", {:.2f} by way of the evidences",
                          all.ln_suspiciousness_from_evidence));
}

std::string surveys_block(const Comparison& all) {
    if (all.alone.size() < 2) return "";
    std::string text = heading("Survey against survey");
    TextTable table("lrr");
    table.row({"difference of velocities", "chi2 (3)", "sigma"});
    for (const SurveyPair& pair : all.pairs)
        table.row({pair.first + " - " + pair.second,
                   plain(pair.difference.chi2, "{:.2f}"),
                   sigma(pair.difference.sigma)});
    return text + table.text() + folded(consistency_words(all), 0);
}

// ---- fit ----

std::string place(const ResidualPixel& pixel, Frame frame) {
    const LonLat galactic = lon_lat_of(rotation(frame, Frame::galactic) * pixel.centre);
    return fmt::format("l {:.1f}, b {:+.1f}", galactic.lon_deg, galactic.lat_deg);
}

std::string fit_block(const Comparison& all) {
    std::string text = heading("Does the model fit?");
    TextTable table("lrrrl");
    table.row({"bin", "dispersion", "p", "p of l = 2, 3, 4", "furthest pixel"});
    for (const FitCheck& check : all.fit)
        table.row({check.survey + " " + check.bin,
                   fmt::format("{:.4f} +- {:.4f}", check.dispersion, check.dispersion_sd),
                   probability(check.probability),
                   fmt::format("{}  {}  {}",
                               probability(check.power[0].probability),
                               probability(check.power[1].probability),
                               probability(check.power[2].probability)),
                   check.largest.empty()
                       ? "-"
                       : fmt::format("{:+.1f} sigma at {}",
                                     check.largest.front().sigma,
                                     place(check.largest.front(), all.frame))});
    text += table.text();
    text += folded(
        "Dispersion: Pearson's chi2 over its degrees of freedom, 1 for Poisson counts. p: of "
        "more, were the counts as the job says. Multipoles: power of the residuals against "
        "Poisson counts on the same sky. The furthest of n pixels is expected near sqrt(2 ln "
        "n) "
        "sigma, 4.6 for 40 000.",
        0);
    return text;
}

std::string overlap_block(const Comparison& all) {
    if (all.overlap.empty()) return "";
    std::string text = heading("Sky and sources in common");
    TextTable table("lrrrr");
    table.row({"", "shared sky", "radius (arcsec)", "matches", "by chance"});
    for (const SurveyOverlap& one : all.overlap)
        table.row({one.first + ", " + one.second,
                   fmt::format("{:.3f}", one.shared_sky_fraction),
                   fmt::format("{:g}", one.match_arcsec),
                   one.matches ? grouped(*one.matches) : "-",
                   one.matches ? short_number(one.expected_by_chance) : "-"});
    return text + table.text() +
           folded(
               "Matches: counted sources of the second survey with one of the first within "
               "the radius; they count twice in a joint posterior unless deduplicated.",
               0);
}

}  // namespace

std::string to_text(const Comparison& all) {
    std::string text = heading(all.job + ": comparison", '=');
    for (const std::string& block : {warnings_block(all.warnings),
                                     offset_block(all),
                                     hypotheses_block(all),
                                     intrinsic_block(all),
                                     surveys_block(all),
                                     fit_block(all),
                                     overlap_block(all)}) {
        if (block.empty()) continue;
        text += '\n';
        text += block;
    }
    return text;
}

}  // namespace deviascope
