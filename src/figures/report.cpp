// SPDX-License-Identifier: GPL-2.0-or-later
#include "deviascope/figures/report.h"

#include <fmt/format.h>
#include <fmt/ranges.h>

#include <algorithm>
#include <cmath>

#include "deviascope/core/grouped_number.h"
#include "deviascope/core/physical_constants.h"
#include "deviascope/summary/result_tables.h"
#include "figures/axis.h"
#include "figures/backends.h"
#include "figures/sky_figures.h"
#include "summary/counted_words.h"
#include "summary/rounding.h"
#include "summary/vector_words.h"

namespace deviascope {
namespace {

constexpr const char* style = R"(
:root{color-scheme:light dark;--page:#FFFFFF;--ink:#1D202B;--grey:#666871;--rule:#C6C7CD;--caution:#F8EFE6;--edge:#9A5A2B}
@media (prefers-color-scheme:dark){:root{--page:#16181F;--ink:#E7E9F0;--grey:#A6A9B4;--rule:#43464F;--caution:#2D2620;--edge:#D49A66;DARK}}
@media print{:root{--page:#FFFFFF;--ink:#1D202B;--grey:#666871;--rule:#C6C7CD;--caution:#F8EFE6;LIGHT}figure,table{break-inside:avoid}.wide{overflow:visible}pre{white-space:pre-wrap}figure svg{min-width:0}}
*{box-sizing:border-box}
body{margin:0 auto;max-width:46rem;padding:1.2rem 1rem 4rem;background:var(--page);color:var(--ink);font:1rem/1.55 'Open Sans','DejaVu Sans',sans-serif;overflow-wrap:break-word}
h1{font-size:1.6rem;line-height:1.25;margin:.2em 0}h2{font-size:1.2rem;margin:2.2em 0 .5em;border-bottom:1px solid var(--rule);padding-bottom:.2em}
.lead{color:var(--grey);margin:.2em 0 1em}a{color:inherit}
.caution{background:var(--caution);border-left:4px solid var(--edge);padding:.6em 1em;margin:1em 0}.caution h2{border:0;margin:0 0 .3em;padding:0;font-size:1.05rem}.caution ul{margin:.2em 0;padding-left:1.2em}
.result{font-size:1.12rem}
figure{margin:1.4em 0}figure svg{display:block;width:100%;min-width:40rem;height:auto}figcaption{font-size:.88rem;color:var(--grey);margin-top:.4em}
.wide{overflow-x:auto}table{border-collapse:collapse;font-size:.84rem;margin:.8em 0}caption{text-align:left;color:var(--grey);padding-bottom:.4em}
th,td{padding:.22em .7em .22em 0;text-align:left;vertical-align:top;font-weight:400;border-bottom:1px solid var(--rule)}th{font-weight:600}.r{text-align:right;white-space:nowrap}
pre{overflow-x:auto;font-size:.78rem;line-height:1.35;border:1px solid var(--rule);padding:.7em}
)";

std::string replaced(std::string text, const std::string& from, const std::string& to) {
    if (const std::size_t at = text.find(from); at != std::string::npos)
        text.replace(at, from.size(), to);
    return text;
}

/// The colours of inlined SVGs: on a dark page, and back again in print.
std::string style_sheet() {
    return replaced(replaced(style, "DARK", dark_properties()), "LIGHT", light_properties());
}

std::string paragraph(const std::string& text, const std::string& kind = "") {
    return kind.empty() ? fmt::format("<p>{}</p>\n", escaped(text))
                        : fmt::format("<p class=\"{}\">{}</p>\n", kind, escaped(text));
}

std::string section(const std::string& id, const std::string& title, const std::string& body) {
    return fmt::format(
        "<section aria-labelledby=\"{0}\">\n<h2 id=\"{0}\">{1}</h2>\n{2}</section>\n",
        id,
        escaped(title),
        body);
}

std::string in_frame(const std::string& table) {
    return "<div class=\"wide\" tabindex=\"0\">\n" + table + "</div>\n";
}

// ---- words ----

std::string measured(const ScalarEstimate& estimate, double unit) {
    const double error = half_width(estimate.interval68) * unit;
    return fmt::format("{} (68 %: {} to {})",
                       measured_number(estimate.median * unit, error),
                       measured_number(estimate.interval68[0] * unit, error),
                       measured_number(estimate.interval68[1] * unit, error));
}

/// The amplitude with its interval, or its upper limit.
std::string amplitude_words(const VectorSummary& vector, double unit) {
    if (!vector.amplitude_limits) return measured(vector.amplitude, unit);
    const auto& [limit68, limit95] = *vector.amplitude_limits;
    return fmt::format("less than {} (95 %)",
                       measured_number(limit95 * unit, 0.5 * limit68 * unit));
}

std::string towards(const VectorSummary& vector) {
    if (!vector.galactic)
        return "without a mean direction (its region may be the whole sky, or several)";
    std::string text = "towards " + place_in_words(*vector.galactic, Frame::galactic);
    if (vector.region68 && vector.region68->radius_deg)
        text += fmt::format(" within {}° (68 %)", short_number(*vector.region68->radius_deg));
    return text;
}

std::string velocity_sentence(const Summary& summary) {
    const VectorSummary& velocity = summary.velocity;
    if (!velocity.amplitude_free)
        return fmt::format("The observer's velocity was fixed at {} km/s.",
                           short_number(velocity.amplitude.median * speed_of_light_km_s));
    return fmt::format("The observer moves at {} km/s {}.",
                       amplitude_words(velocity, speed_of_light_km_s),
                       towards(velocity));
}

std::string intrinsic_sentence(const Summary& summary) {
    std::vector<std::string> parts;
    for (const VectorSummary& vector : summary.intrinsic) {
        if (!vector.amplitude_free) {
            parts.push_back(fmt::format("the {} was fixed at {}",
                                        name_of(vector),
                                        short_number(vector.amplitude.median)));
            continue;
        }
        parts.push_back(fmt::format("the {} has an amplitude of {} in thousandths, {}",
                                    name_of(vector),
                                    amplitude_words(vector, 1000.0),
                                    towards(vector)));
    }
    std::string text = fmt::format("{}.", fmt::join(parts, "; "));
    if (text[0] == 't') text[0] = 'T';
    return text;
}

std::string question(const Summary& summary) {
    return fmt::format(
        "How fast, and where to, does the observer move, and is there an intrinsic dipole "
        "beyond that motion? Asked of {} ({}).",
        counted_words(summary),
        fmt::join(summary.survey_names, ", "));
}

std::string warnings_block(const std::vector<std::string>& warnings) {
    if (warnings.empty()) return paragraph("No warnings.");
    std::string items;
    for (const std::string& warning : warnings)
        items += fmt::format("<li>{}</li>\n", escaped(warning));
    return fmt::format(
        "<section class=\"caution\" aria-labelledby=\"warnings\">\n<h2 id=\"warnings\">{} "
        "before you believe it</h2>\n<ul>\n{}</ul>\n</section>\n",
        warnings.size() == 1 ? "One warning" : fmt::format("{} warnings", warnings.size()),
        items);
}

// ---- figures and tables ----

std::string figure_block(const Figure& figure) {
    return fmt::format(
        "<figure id=\"{0}\">\n<div class=\"wide\" tabindex=\"0\">\n{1}</div>\n<figcaption>{2} "
        "<a href=\"figures/{0}.pdf\">PDF</a>, <a "
        "href=\"figures/data/{0}.csv\">data</a>.</figcaption>\n</figure>\n",
        figure.name,
        figure.inlined_svg,
        escaped(figure.reading_aid));
}

std::string figures_named(const std::vector<Figure>& figures, const std::string& beginning) {
    std::string blocks;
    for (const Figure& figure : figures)
        if (figure.name.starts_with(beginning)) blocks += figure_block(figure);
    return blocks;
}

std::string cuts_blocks(const Summary& summary) {
    std::string blocks;
    for (std::size_t survey = 0; survey < summary.cuts.size(); ++survey) {
        const CutReport& cuts = summary.cuts[survey];
        ResultTable table;
        table.caption = "Cuts of " + summary.survey_names[survey];
        table.sides = "lrr";
        table.header = {"", "catalogue rows", "pixels"};
        table.rows.push_back(
            {"read, and on the grid", grouped(cuts.rows_read), grouped(cuts.pixels_total)});
        for (const CutLine& cut : cuts.cuts)
            table.rows.push_back(
                {cut.name, grouped(-cut.rows_removed), grouped(-cut.pixels_removed)});
        table.rows.push_back({"kept", grouped(cuts.rows_kept), grouped(cuts.pixels_kept)});
        blocks += in_frame(to_html(table));
    }
    return blocks;
}

bool has_free_intrinsic(const Summary& summary) {
    return std::ranges::any_of(summary.intrinsic,
                               [](const VectorSummary& one) { return one.amplitude_free; });
}

std::string separation_block(const Summary& summary) {
    std::string text = separation_sentence(summary);
    if (const auto& share = summary.separation.joint.velocity_prior_share)
        text += fmt::format(" Priors give {:.1f} % of the velocity.", 100.0 * *share);
    text = paragraph(text);
    if (!has_free_intrinsic(summary) || !summary.velocity.amplitude_free) return text;
    for (std::size_t survey = 0; survey < summary.separation.surveys.size(); ++survey)
        text += paragraph(fmt::format("{} alone: {}.",
                                      summary.survey_names[survey],
                                      summary.separation.surveys[survey].verdict));
    return text;
}

std::string offset_block(const Summary& summary) {
    if (!summary.offset_from_cmb || !summary.velocity.amplitude_free) return "";
    const CmbOffset& offset = *summary.offset_from_cmb;
    std::vector<std::string> parts;
    if (std::isfinite(offset.angle_median_deg)) {
        const double error = half_width(offset.angle68_deg);
        parts.push_back(fmt::format("the angle between the two is {}° (68 %: {}° to {}°)",
                                    measured_number(offset.angle_median_deg, error),
                                    measured_number(offset.angle68_deg[0], error),
                                    measured_number(offset.angle68_deg[1], error)));
    }
    if (std::isfinite(offset.speed_ratio_median)) {
        const double error = half_width(offset.speed_ratio68);
        parts.push_back(fmt::format("the speed is {} times that of the CMB (68 %: {} to {})",
                                    measured_number(offset.speed_ratio_median, error),
                                    measured_number(offset.speed_ratio68[0], error),
                                    measured_number(offset.speed_ratio68[1], error)));
    }
    return paragraph(fmt::format("Against the velocity inferred from the CMB dipole: {}.",
                                 fmt::join(parts, ", and ")));
}

/// What a comparison adds in words; nothing where none has been made.
std::string rivals_block(const Comparison* comparison) {
    if (comparison == nullptr || comparison->hypotheses.size() < 2) return "";
    const auto& hypotheses = comparison->hypotheses;
    const HypothesisResult& best = hypotheses[best_hypothesis(hypotheses)];
    std::vector<std::string> against;
    for (const HypothesisResult& one : hypotheses)
        if (&one != &best)
            against.push_back(
                fmt::format("{}: {}",
                            one.name,
                            grade_of(best.evidence.bridge.value - one.evidence.bridge.value)));
    std::string text = paragraph(
        fmt::format("Of {} hypotheses, {} has the largest evidence ({}, intrinsic {}); against "
                    "the others the evidence is, {}.",
                    hypotheses.size(),
                    best.name,
                    best.velocity,
                    best.intrinsic,
                    fmt::join(against, ", ")));
    const Consistency& together = comparison->consistency;
    if (std::isfinite(together.sigma))
        text += paragraph(fmt::format(
            "{} surveys, each fitted alone, are {} standard deviations off one velocity "
            "(χ² {} of {} degrees of freedom).",
            together.n_surveys,
            plain_number(together.sigma, 1),
            plain_number(together.chi2, 1),
            plain_number(together.degrees, 0)));
    return text;
}

/// The summary's warnings, then those that only the comparison has.
std::vector<std::string> all_warnings(const FigureSource& source) {
    std::vector<std::string> all = source.summary.warnings;
    if (source.comparison == nullptr) return all;
    for (const std::string& warning : source.comparison->warnings)
        if (std::ranges::find(all, warning) == all.end()) all.push_back(warning);
    return all;
}

std::string sampling_table(const SamplingSummary& sampling) {
    ResultTable table;
    table.caption = "Sampling";
    table.sides = "lr";
    table.header = {"", "value"};
    const auto row = [&](const char* name, const std::string& value) {
        table.rows.push_back({name, value});
    };
    row("converged", sampling.converged ? "yes" : "NO: not for publication");
    row("replicates × walkers", fmt::format("{} × {}", sampling.replicates, sampling.walkers));
    row("steps a walker", grouped(sampling.outcome.steps));
    row("of them warm-up, discarded", grouped(sampling.outcome.discarded));
    row("stored draws", grouped(sampling.n_draws));
    row("largest R-hat over walkers (limit 1.05)", number_or_dash(sampling.walker_rhat_max, 3));
    row("largest R-hat over replicates (limit 1.01)",
        number_or_dash(sampling.replicate_rhat_max, 4));
    row("fewest effective draws", number_or_dash(sampling.effective_draws_min, 0));
    row("longest autocorrelation (steps)",
        number_or_dash(sampling.autocorrelation_steps_max, 1));
    return in_frame(to_html(table));
}

std::string provenance_block(const Provenance& provenance) {
    ResultTable table;
    table.caption = "Inputs, and the SHA-256 of their bytes";
    table.sides = "lrl";
    table.header = {"file", "bytes", "SHA-256"};
    for (const InputDigest& input : provenance.inputs)
        table.rows.push_back({input.path, grouped(input.bytes), input.sha256});
    return paragraph(fmt::format("deviascope {}, seed {}; {}.",
                                 provenance.version,
                                 provenance.seed,
                                 provenance.libraries)) +
           (table.rows.empty() ? "" : in_frame(to_html(table))) +
           fmt::format("<details><summary>Job file {}</summary>\n<pre>{}</pre></details>\n",
                       escaped(provenance.job_name),
                       escaped_lines(provenance.job_text));
}

std::string body_of(const FigureSource& source, const std::vector<Figure>& figures) {
    const Summary& summary = source.summary;
    std::string body = warnings_block(all_warnings(source));
    body += section("question", "Question", paragraph(question(summary)));
    body += section(
        "data", "Data and cuts", in_frame(to_html(bins_table(summary))) + cuts_blocks(summary));
    body += section("result",
                    "Result",
                    paragraph(velocity_sentence(summary), "result") +
                        paragraph(intrinsic_sentence(summary), "result") +
                        separation_block(summary) + in_frame(to_html(results_table(summary))));
    body += section("directions-section", "Directions", figures_named(figures, "directions"));
    body += section("amplitudes-section",
                    "Amplitudes",
                    figures_named(figures, "amplitudes") + figures_named(figures, "joint"));
    const std::string comparison = offset_block(summary) + rivals_block(source.comparison) +
                                   figures_named(figures, "hypotheses") +
                                   figures_named(figures, "surveys");
    if (!comparison.empty()) body += section("comparison", "Comparison", comparison);
    body += section("fit",
                    "Does the model fit?",
                    figures_named(figures, "profile") + figures_named(figures, "residuals") +
                        figures_named(figures, "weights"));
    body += section("convergence",
                    "Did the sampling converge?",
                    sampling_table(summary.sampling) + figures_named(figures, "traces"));
    return body +
           section("provenance", "Provenance", provenance_block(source.chain.provenance));
}

}  // namespace

std::string report_html(const FigureSource& source, const std::vector<Figure>& figures) {
    const std::string title = escaped(source.summary.job);
    return fmt::format(
               "<!DOCTYPE html>\n<html lang=\"en\">\n<head>\n<meta charset=\"utf-8\">\n<meta "
               "name=\"viewport\" content=\"width=device-width, initial-scale=1\">\n<title>{0}"
               "</title>\n<style>{1}</style>\n</head>\n<body>\n<header>\n<h1>{0}</h1>\n<p "
               "class=\"lead\">Observer's velocity and intrinsic dipole from counts of distant "
               "sources. Intervals and regions hold 68.27 % and 95.45 % of the posterior.</p>\n"
               "</header>\n<main>\n",
               title,
               style_sheet()) +
           body_of(source, figures) + "</main>\n</body>\n</html>\n";
}

}  // namespace deviascope
