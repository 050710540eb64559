// SPDX-License-Identifier: GPL-2.0-or-later
#include <fmt/format.h>

#include <algorithm>
#include <cmath>

#include "app/commands.h"
#include "app/steps.h"
#include "app/terminal.h"
#include "app/weigh_step.h"
#include "deviascope/core/grouped_number.h"
#include "deviascope/core/physical_constants.h"
#include "deviascope/model/forecast.h"
#include "deviascope/model/posterior.h"
#include "summary/rounding.h"
#include "summary/text_table.h"

namespace deviascope {

namespace {

std::string table_of_bins(const Job& job, const Counts& counts) {
    TextTable table("lrrrr");
    table.row({"survey and bin", "sources", "pixels", "sky fraction", "kinematic weight"});
    const Pixelisation grid(counts.nside);
    for (std::size_t s = 0; s < counts.surveys.size(); ++s) {
        const SurveyCounts& survey = counts.surveys[s];
        const WeightPrior& weights = job.model.surveys[s].weights;
        for (std::size_t b = 0; b < survey.bins.size(); ++b) {
            const BinCounts& bin = survey.bins[b];
            const auto i = static_cast<Eigen::Index>(b);
            table.row(
                {survey.name + " " + bin.name,
                 grouped(bin.total()),
                 grouped(std::ssize(bin.count)),
                 fmt::format("{:.3f}", survey.footprints[bin.footprint].sky_fraction(grid)),
                 fmt::format("{:.4g} +- {:.2g}",
                             weights.mean[i],
                             std::sqrt(weights.covariance(i, i)))});
        }
    }
    return table.text();
}

std::string sd_text(double sd, double unit) {
    return std::isfinite(sd) ? short_number(sd / unit) : "no limit";
}

/// The vector as a heading, and the unit its numbers are given in.
struct Row {
    std::string heading;
    double unit;
};

Row row_of(const std::string& name) {
    if (name == "velocity") return {"velocity (km/s)", 1.0 / speed_of_light_km_s};
    return {name.substr(name.find('.') + 1) + ": intrinsic dipole (10^-3)", 1e-3};
}

std::string table_of_vectors(const std::vector<VectorForecast>& forecasts) {
    TextTable table("lrrr");
    table.row({"one component, 1 sd", "counts alone", "expected", "prior alone"});
    for (const VectorForecast& vector : forecasts) {
        const auto [heading, unit] = row_of(vector.name);
        if (vector.n_free == 0)
            table.row({heading, "", "fixed", ""});
        else
            table.row({heading,
                       sd_text(vector.counts_sd, unit),
                       sd_text(vector.expected_sd, unit),
                       sd_text(vector.prior_sd, unit)});
    }
    return table.text();
}

std::string line_of_sampling(const Job& job, const ParameterSpace& space) {
    return fmt::format(
        "{} parameters, {} coordinates to sample, with {} ensembles of {} walkers, until {} "
        "effective draws or {} steps.",
        space.n_parameters(),
        space.n_coordinates(),
        job.ensemble.replicates,
        job.ensemble.walkers_for(space.n_coordinates()),
        short_number(job.ensemble.effective_draws),
        grouped(job.ensemble.max_steps));
}

}  // namespace

ExitCode check_command(const CommandOptions& options) {
    Terminal terminal(options.quiet);
    const Job written = read_job(options.input);
    for (const std::string& warning : written.warnings) terminal.warn(warning);
    terminal.say(fmt::format("{}: {}", written.name, written.title));
    const Job job = weighed(written, options.n_threads(), terminal);
    const Counts counts = count_surveys(job, terminal);
    const Posterior posterior(counts, job.model, job.seed);
    const std::vector<std::string> doubts = posterior.warnings();
    for (const std::string& doubt : doubts) terminal.warn(doubt);
    const std::size_t n_warnings =
        job.warnings.size() + doubts.size() +
        warn_of_counts_and_priors(counts, posterior.space(), terminal);
    terminal.say(fmt::format("\n{}", table_of_bins(job, counts)));
    terminal.say("Expected precision, from the information of these counts at zero dipoles:\n");
    terminal.say(table_of_vectors(forecast(counts, posterior.space())));
    terminal.say(line_of_sampling(job, posterior.space()));
    terminal.say(fmt::format("The job can run. {}; nothing was written.",
                             n_warnings == 0   ? "No warnings"
                             : n_warnings == 1 ? "One warning"
                                               : fmt::format("{} warnings", n_warnings)));
    return options.strict && n_warnings > 0 ? ExitCode::doubtful : ExitCode::done;
}

}  // namespace deviascope
