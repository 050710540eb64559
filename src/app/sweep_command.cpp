// SPDX-License-Identifier: GPL-2.0-or-later
#include <fmt/format.h>

#include <algorithm>
#include <utility>

#include "app/commands.h"
#include "app/fit.h"
#include "app/steps.h"
#include "app/weigh_step.h"
#include "deviascope/job/variation.h"
#include "deviascope/summary/sweep.h"
#include "summary/draw_moments.h"

namespace deviascope {

namespace {

struct Variant {
    std::string path, value;
    Job job;
};

/// All jobs are read before any is run, so that a fault of the last shows at once.
std::vector<Variant> variants_of(const Job& job, const CommandOptions& options) {
    std::vector<Variant> variants;
    for (const std::string& written : options.vary) {
        const Variation variation = parse_variation(written);
        for (const std::string& value : variation.values)
            variants.push_back(
                {variation.path,
                 value,
                 read_job(options.input, varied_text(job.text, variation.path, value))});
    }
    return variants;
}

constexpr const char* unchanged = "the job as it is";

SweepRow row_of(const Fit& fit, const Counts& counts) {
    SweepRow row;
    const Pixelisation grid(counts.nside);
    for (const SurveyCounts& survey : counts.surveys) {
        for (const BinCounts& bin : survey.bins) row.sources += bin.total();
        for (const Footprint& footprint : survey.footprints)
            row.sky_fraction = std::max(row.sky_fraction, footprint.sky_fraction(grid));
    }
    const DrawMoments moments = moments_of(fit.vector(0));
    row.velocity = {moments.mean, moments.covariance};
    row.speed = fit.amplitude(0);
    if (!row.velocity.mean.isZero(0.0))
        row.galactic = lon_lat_of(rotation(counts.frame, Frame::galactic) * row.velocity.mean);
    for (std::size_t v = 1; v < fit.posterior->vectors().size(); ++v) {
        const std::string& name = fit.posterior->vectors()[v].name;
        row.intrinsic.push_back({name.substr(name.find('.') + 1), fit.amplitude(v)});
    }
    row.converged = fit.converged();
    return row;
}

/// A row without its path and value; what its fit warns of goes to `warnings`.
SweepRow run(const Job& written,
             const std::string& name,
             const CommandOptions& options,
             Terminal& terminal,
             std::vector<std::string>& warnings) {
    Terminal silent(true);
    Job job = weighed(written, options.n_threads(), silent);
    const auto counts = std::make_shared<Counts>(count_surveys(job, silent));
    measure_dispersions(job, *counts, silent);
    Fitter fitter(job, options, terminal);
    SweepRow row = row_of(fitter.fit(name, counts, job.model), *counts);
    warnings.insert(warnings.end(), fitter.warnings().begin(), fitter.warnings().end());
    return row;
}

void warn_of_rows(Sweep& sweep) {
    constexpr double doubtful_sigma = 3.0;
    for (const SweepRow& row : sweep.rows) {
        const std::string name = row.path.empty() ? unchanged : row.path + " = " + row.value;
        if (!row.converged) sweep.warnings.push_back(name + ": the run did not converge.");
        if (row.difference.sigma >= doubtful_sigma)
            sweep.warnings.push_back(
                fmt::format("{}: the velocity moves by {:.1f} sigma of the expected scatter.",
                            name,
                            row.difference.sigma));
    }
}

}  // namespace

ExitCode sweep_command(const CommandOptions& options) {
    Terminal terminal(options.quiet);
    const Job job = read_job(options.input);
    const std::filesystem::path folder = folder_of(options);
    const std::vector<Variant> variants = variants_of(job, options);
    prepare_output(folder, {"sweep.json", "sweep.csv"}, existing_of(options));
    for (const std::string& warning : job.warnings) terminal.warn(warning);

    Sweep sweep;
    sweep.job = job.title;
    sweep.frame = job.frame;
    sweep.rows.push_back(run(job, unchanged, options, terminal, sweep.warnings));
    terminal.say(fmt::format("Run: {}.", unchanged));
    for (const Variant& variant : variants) {
        const std::string name = variant.path + " = " + variant.value;
        SweepRow row = run(variant.job, name, options, terminal, sweep.warnings);
        row.path = variant.path;
        row.value = variant.value;
        row.difference = nested_difference(row.velocity, sweep.rows.front().velocity);
        terminal.say(fmt::format("Run: {}.", name));
        sweep.rows.push_back(std::move(row));
    }
    warn_of_rows(sweep);
    write_text(folder / "sweep.json", to_json(sweep));
    write_text(folder / "sweep.csv", to_csv(sweep));
    terminal.say(to_text(sweep));
    terminal.say(
        fmt::format("Written: {} and sweep.csv beside it.", (folder / "sweep.json").string()));
    return options.strict && !sweep.warnings.empty() ? ExitCode::doubtful : ExitCode::done;
}

}  // namespace deviascope
