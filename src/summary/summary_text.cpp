// SPDX-License-Identifier: GPL-2.0-or-later
#include <fmt/format.h>

#include <algorithm>
#include <cmath>

#include "deviascope/core/grouped_number.h"
#include "deviascope/core/physical_constants.h"
#include "deviascope/summary/summary.h"
#include "summary/counted_words.h"
#include "summary/rounding.h"
#include "summary/text_table.h"
#include "summary/vector_words.h"

namespace deviascope {
namespace {

constexpr double thousandth = 1e-3;  // amplitudes are printed in this unit

// ---- head and warnings ----

std::string head(const Summary& summary) {
    std::string text = heading(summary.job, '=');
    text += folded(
        fmt::format("Observer's velocity and intrinsic dipole from {}; "
                    "{} draws of the posterior, vectors in the {} frame. Intervals are the "
                    "shortest and regions of sky the smallest that hold 68.27 % and 95.45 % of "
                    "the draws.",
                    counted_words(summary),
                    grouped(summary.sampling.n_draws),
                    name_of(summary.frame)),
        0);
    return text;
}

// ---- vectors ----

void amplitude_row(TextTable& table,
                   const std::string& name,
                   const ScalarEstimate& estimate,
                   double prior_median) {
    const double uncertainty = half_width(estimate.interval68);
    table.row({name,
               rounded(estimate.median, uncertainty),
               rounded(estimate.interval68, uncertainty),
               rounded(estimate.interval95, uncertainty),
               short_number(prior_median)});
}

std::string amplitude_table(const VectorSummary& vector) {
    const bool is_velocity = vector.name == "velocity";
    TextTable table("lrrrr");
    table.row({"", "median", "68 % interval", "95 % interval", "median of the prior alone"});
    if (is_velocity)
        amplitude_row(table,
                      "speed (km/s)",
                      in_unit(vector.amplitude, 1.0 / speed_of_light_km_s),
                      vector.prior_median_amplitude * speed_of_light_km_s);
    amplitude_row(table,
                  is_velocity ? "speed (10^-3 c)" : "amplitude (10^-3)",
                  in_unit(vector.amplitude, thousandth),
                  vector.prior_median_amplitude / thousandth);
    return table.text();
}

/// A place on the sky, rounded by the standard deviation along one coordinate.
void place_row(TextTable& table,
               const std::string& frame,
               const std::optional<LonLat>& place,
               const std::optional<SkyRegion>& region) {
    if (!place) return table.row({frame, "-", "-"});
    // 68.27 % of a circular Gaussian lie within 1.515 standard deviations.
    const double sd = region && region->radius_deg ? *region->radius_deg / 1.515 : 1.0;
    table.row({frame, rounded(place->lon_deg, sd), rounded(place->lat_deg, sd)});
}

std::string direction_table(const VectorSummary& vector) {
    TextTable table("lrr");
    table.row({"mean direction", "longitude (deg)", "latitude (deg)"});
    place_row(table, "galactic (l, b)", vector.galactic, vector.region68);
    place_row(table, "ICRS (RA, Dec)", vector.icrs, vector.region68);
    return table.text();
}

void region_row(TextTable& table, const std::string& name, const SkyRegion& region) {
    table.row({name,
               short_number(region.area_deg2),
               region.radius_deg ? short_number(*region.radius_deg) : "-"});
}

std::string region_table(const VectorSummary& vector) {
    if (!vector.region68 || !vector.region95) return "";
    TextTable table("lrr");
    table.row({"draws within", "area of sky (sq deg)", "radius about the mean (deg)"});
    region_row(table, "68 %", *vector.region68);
    region_row(table, "95 %", *vector.region95);
    return fmt::format("\n{}", table.text());
}

std::string direction_block(const VectorSummary& vector) {
    if (!vector.direction_free)
        return direction_table(vector) + folded("The direction is fixed by the prior.", 2);
    if (vector.galactic) return direction_table(vector) + region_table(vector);
    return folded(
               "No direction to speak of: the draws point so widely over the sky that their "
               "mean "
               "unit vector is shorter than 0.2.",
               2) +
           region_table(vector);
}

std::string offset_table(const CmbOffset& offset) {
    const double angle = half_width(offset.angle68_deg);
    const double ratio = half_width(offset.speed_ratio68);
    TextTable table("lrr");
    table.row({"against the velocity inferred from the CMB", "median", "68 % interval"});
    table.row({"angle between the two (deg)",
               rounded(offset.angle_median_deg, angle),
               rounded(offset.angle68_deg, angle)});
    table.row({"speed over that of the CMB",
               rounded(offset.speed_ratio_median, ratio),
               rounded(offset.speed_ratio68, ratio)});
    return table.text();
}

std::string vector_heading(const VectorSummary& vector) {
    if (vector.name == "velocity") return heading("Velocity of the observer");
    if (vector.name == "all") return heading("Intrinsic dipole, shared by all surveys");
    return heading("Intrinsic dipole of " + vector.name);
}

std::string vector_block(const VectorSummary& vector) {
    std::string text = vector_heading(vector);
    text += folded(fmt::format("Prior {}: {}.", vector.prior, vector.prior_description), 2);
    if (!vector.amplitude_free) return text;
    text += "\n" + amplitude_table(vector);
    if (vector.amplitude_limits)
        text += folded(fmt::format("Not told from zero: 95.45 % of the draws lie below {}.",
                                   limit_in_words(vector)),
                       2);
    return text + "\n" + direction_block(vector);
}

// ---- bins and separation ----

/// What the errors of the weights, taken together, do to the vectors.
std::string modes_block(const Summary& summary) {
    TextTable table("lrrrr");
    table.row(
        {"weights of", "common factor", "prior", "shift left over", "false dipole (10^-3)"});
    bool any = false;
    for (std::size_t survey = 0; survey < summary.weight_modes.size(); ++survey) {
        const auto& [common, differential] = summary.weight_modes[survey];
        if (common.prior_sd <= 0.0) continue;
        any = true;
        const auto pair = [](double mean, double sd) {
            return rounded(mean, sd) + " +- " + rounded(sd, sd);
        };
        table.row({summary.survey_names[survey],
                   pair(common.mean, common.sd),
                   pair(1.0, common.prior_sd),
                   pair(differential.mean, differential.sd),
                   short_number(1e3 * differential.sd * summary.velocity.amplitude.median)});
    }
    if (!any) return "";
    const std::string legend = folded(
        "Common factor: the error that all weights of a survey share; it rescales the "
        "velocity. Shift left over: what it does not explain; it fakes an intrinsic dipole "
        "along the velocity, of the standard deviation given. Both are part of the posterior "
        "above.",
        2);
    return fmt::format("\n{}{}", table.text(), legend);
}

std::string bins_block(const Summary& summary) {
    TextTable counts("lrrrrr"), weights("lrrr");
    counts.row({"bin", "sources", "pixels", "of the sky", "sources per sr", "68 % interval"});
    weights.row({"kinematic weight", "median", "68 % interval", "prior"});
    for (const BinSummary& bin : summary.bins) {
        const std::string name = bin.survey + " " + bin.bin;
        const double monopole = half_width(bin.monopole.interval68);
        counts.row({name,
                    grouped(bin.sources),
                    grouped(bin.pixels),
                    fmt::format("{:.4f}", bin.sky_fraction),
                    rounded(bin.monopole.median, monopole),
                    rounded(bin.monopole.interval68, monopole)});
        const double prior_sd = bin.weight_prior_sd;
        if (bin.weight.is_constant()) {
            weights.row({name, rounded(bin.weight.median, 0.0), "fixed", "fixed"});
            continue;
        }
        const double weight = half_width(bin.weight.interval68);
        weights.row(
            {name,
             rounded(bin.weight.median, weight),
             rounded(bin.weight.interval68, weight),
             rounded(bin.weight_prior_mean, prior_sd) + " +- " + rounded(prior_sd, prior_sd)});
    }
    return heading("Bins") + counts.text() + "\n" + weights.text() + modes_block(summary);
}

std::string share_text(const std::optional<double>& share) {
    return share ? fmt::format("{:.3f}", *share) : "-";
}

std::string separation_block(const Summary& summary) {
    TextTable table("lrrl");
    table.row({"", "prior share", "weight spread", "verdict"});
    const SeparationEntry& joint = summary.separation.joint;
    const bool is_single = summary.separation.surveys.size() == 1;
    table.row({is_single ? "posterior" : "all surveys",
               share_text(joint.velocity_prior_share),
               "",
               joint.verdict});
    for (std::size_t survey = 0; survey < summary.separation.surveys.size(); ++survey) {
        const SeparationEntry& entry = summary.separation.surveys[survey];
        table.row({summary.survey_names[survey] + " alone",
                   share_text(entry.velocity_prior_share),
                   entry.weight_spread ? short_number(*entry.weight_spread) : "-",
                   entry.verdict});
    }
    return heading("Are velocity and intrinsic dipole separated?") + table.text() +
           folded(
               "Prior share: the part of the velocity that the counts do not determine (0: "
               "none, 1: all of it). Weight spread: standard deviation of the kinematic "
               "weight over the sources of a survey.",
               2);
}

std::string cuts_block(const Summary& summary) {
    std::vector<std::string> tables;
    for (std::size_t survey = 0; survey < summary.cuts.size(); ++survey)
        tables.push_back(cut_table(summary.survey_names[survey], summary.cuts[survey]));
    return fmt::format("{}", fmt::join(tables, "\n"));
}

// ---- sampling ----

std::string ending(const SamplingSummary& sampling) {
    switch (sampling.outcome.end) {
        case Outcome::End::converged:
            return "yes: the stopping rule was met";
        case Outcome::End::max_steps:
            return "NO: max_steps was reached first";
        case Outcome::End::interrupted:
            return "NO: interrupted";
        case Outcome::End::not_run:
            break;
    }
    return "NO: not finished";
}

std::string run_table(const SamplingSummary& sampling) {
    const Outcome& outcome = sampling.outcome;
    TextTable table("ll");
    table.row({"converged", ending(sampling)});
    table.row({"walkers",
               fmt::format("{} in each of {} independent replicates",
                           sampling.walkers,
                           sampling.replicates)});
    table.row({"steps a walker",
               fmt::format("{}; {} of them warm-up, discarded{}",
                           grouped(outcome.steps),
                           grouped(outcome.discarded),
                           outcome.warm_up_settled ? "" : " (the warm-up did NOT settle)")});
    table.row({"stored",
               fmt::format("one step in {}: {} draws",
                           grouped(outcome.store_every),
                           grouped(sampling.n_draws))});
    table.row({"evaluations",
               fmt::format("{} by the moment engine, {} by the pixel engine",
                           grouped(sampling.moment_evaluations),
                           grouped(sampling.pixel_evaluations))});
    return table.text();
}

std::string kernel_table(const KernelTally& tally) {
    TextTable table("lrrr");
    table.row({"kernel", "proposals tried", "taken", "share taken"});
    for (std::size_t kernel = 0; kernel < n_kernels; ++kernel) {
        if (tally.tried[kernel] == 0) continue;
        const double share =
            static_cast<double>(tally.taken[kernel]) / static_cast<double>(tally.tried[kernel]);
        table.row({name_of(static_cast<Kernel>(kernel)),
                   grouped(tally.tried[kernel]),
                   grouped(tally.taken[kernel]),
                   fmt::format("{:.3f}", share)});
    }
    return table.text();
}

std::string diagnostic(double value, int decimals) {
    return std::isfinite(value) ? fmt::format("{:.{}f}", value, decimals) : "-";
}

std::string whole(double value) {
    return std::isfinite(value) ? grouped(static_cast<std::int64_t>(value)) : "-";
}

std::string scalar_table(const SamplingSummary& sampling) {
    TextTable table("lrrrrr");
    table.row({"", "R-hat of", "R-hat of", "effective", "effective", "correlation"});
    table.row(
        {"scalar", "walkers", "replicates", "draws, bulk", "draws, tails", "time (steps)"});
    table.rule();
    for (const ScalarDiagnostics& scalar : sampling.scalars)
        table.row({scalar.name,
                   diagnostic(scalar.walker_rhat, 3),
                   diagnostic(scalar.replicate_rhat, 4),
                   whole(scalar.bulk),
                   whole(scalar.tail),
                   diagnostic(scalar.autocorrelation_steps, 1)});
    table.rule();
    table.row({"worst",
               diagnostic(sampling.walker_rhat_max, 3),
               diagnostic(sampling.replicate_rhat_max, 4),
               whole(sampling.effective_draws_min),
               "",
               diagnostic(sampling.autocorrelation_steps_max, 1)});
    return table.text();
}

std::string sampling_block(const SamplingSummary& sampling) {
    return heading("Convergence of the sampler (no estimates below this line)") +
           run_table(sampling) + "\n" + kernel_table(sampling.outcome.tally) + "\n" +
           scalar_table(sampling);
}

}  // namespace

std::string cut_table(const std::string& survey, const CutReport& cuts) {
    TextTable table("lrr");
    table.row({"", "catalogue rows", "pixels"});
    table.row({"read, and on the grid", grouped(cuts.rows_read), grouped(cuts.pixels_total)});
    for (const CutLine& cut : cuts.cuts)
        table.row({cut.name, grouped(-cut.rows_removed), grouped(-cut.pixels_removed)});
    table.rule();
    table.row({"kept", grouped(cuts.rows_kept), grouped(cuts.pixels_kept)});
    return heading("Cuts of " + survey) + table.text();
}

std::string to_text(const Summary& summary) {
    std::vector<std::string> blocks = {head(summary), warnings_block(summary.warnings)};
    blocks.push_back(vector_block(summary.velocity));
    if (summary.offset_from_cmb && summary.velocity.amplitude_free)
        blocks.back() += fmt::format("\n{}", offset_table(*summary.offset_from_cmb));
    for (const VectorSummary& vector : summary.intrinsic)
        blocks.push_back(vector_block(vector));
    blocks.push_back(bins_block(summary));
    blocks.push_back(separation_block(summary));
    blocks.push_back(cuts_block(summary));
    blocks.push_back(sampling_block(summary.sampling));
    return fmt::format("{}", fmt::join(blocks, "\n"));
}

}  // namespace deviascope
