// SPDX-License-Identifier: GPL-2.0-or-later
#include "app/steps.h"

#include <fmt/chrono.h>
#include <fmt/format.h>

#include <algorithm>
#include <chrono>

#include "app/interrupt.h"
#include "app/output_folder.h"
#include "deviascope/chain/chain_file.h"
#include "deviascope/core/error.h"
#include "deviascope/core/grouped_number.h"
#include "deviascope/core/version.h"
#include "deviascope/counts/count_sources.h"
#include "deviascope/model/posterior.h"

namespace deviascope {

namespace fs = std::filesystem;

namespace {

constexpr const char* cmb_prior_name = "cmb-velocity";

std::string time_now() {
    const std::time_t now =
        std::chrono::system_clock::to_time_t(std::chrono::system_clock::now());
    return fmt::format("{:%Y-%m-%dT%H:%M:%SZ}", fmt::gmtime(now));
}

/// The prior that `offset_from_cmb` refers to: the job's own copy, else the library's.
Companion cmb_prior(const std::vector<Companion>& companions, const fs::path& folder) {
    const auto own = std::find_if(companions.begin(), companions.end(), [](const Companion& c) {
        return c.name == cmb_prior_name;
    });
    if (own != companions.end()) return *own;
    if (const auto found = find_prior(cmb_prior_name, folder)) return *found;
    throw UsageError({cmb_prior_name,
                      "the prior file is not found",
                      "the program's own priors folder holds it",
                      "reinstall the program, or put cmb-velocity.toml beside the job"});
}

Eigen::Vector3d cmb_velocity(const Companion& companion, Frame frame) {
    const VectorPrior prior = parse_prior(companion, frame);
    const auto* gaussian = std::get_if<GaussianPrior>(&prior.kind());
    if (gaussian != nullptr) return gaussian->mean;
    throw UsageError({companion.path,
                      fmt::format("is of kind {}", prior.kind_name()),
                      "the reference for offsets must be a measured-velocity or gaussian prior",
                      ""});
}

Provenance provenance_of(const Job& job, const InputRecord& inputs) {
    Provenance provenance;
    provenance.job_name = job.name;
    provenance.job_text = job.text;
    provenance.companions = job.companions;
    const Companion reference = cmb_prior(job.companions, job.folder);
    const bool known = std::any_of(job.companions.begin(),
                                   job.companions.end(),
                                   [](const Companion& c) { return c.name == cmb_prior_name; });
    if (!known) provenance.companions.push_back(reference);
    provenance.inputs = inputs.files;
    provenance.version = version();
    provenance.seed = job.seed;
    provenance.started = time_now();
    return provenance;
}

void report_outcome(const Outcome& outcome, double seconds, Terminal& terminal) {
    const char* end = outcome.end == Outcome::End::converged     ? "converged"
                      : outcome.end == Outcome::End::interrupted ? "interrupted"
                                                                 : "NOT converged at max_steps";
    terminal.say(
        fmt::format("Sampled {} steps per walker, the first {} discarded, every {} stored: "
                    "{} ({:.1f} s).",
                    grouped(outcome.steps),
                    grouped(outcome.discarded),
                    outcome.store_every,
                    end,
                    seconds));
}

/// Readers of long files ask nobody whether to go on; where they tell how far they are, a
/// request to end can be heard.
Progress ending_on_request(Progress show) {
    return [show = std::move(show)](const std::string& line) {
        if (interrupt_requested()) throw Interrupted();
        if (show) show(line);
    };
}

Job job_of(const Chain& chain) {
    const auto finder = [&](const std::string& name) -> std::optional<Companion> {
        for (const Companion& companion : chain.provenance.companions)
            if (companion.name == name) return companion;
        return std::nullopt;
    };
    return parse_job(chain.provenance.job_text, chain.provenance.job_name, finder);
}

}  // namespace

InputRecord record_inputs(const Job& job, Terminal& terminal) {
    for (const std::string& warning : job.warnings) terminal.warn(warning);
    InputRecord record;
    record.files = digests_of_inputs(job, ending_on_request(terminal.progress()));
    record.counts_digest = digest_of_inputs(job, record.files);
    return record;
}

CountsFile make_counts(const Job& job,
                       const InputRecord& inputs,
                       const fs::path& folder,
                       Terminal& terminal) {
    CountsFile file;
    file.counts.nside = job.nside;
    file.counts.frame = job.frame;
    file.digest = inputs.counts_digest;
    file.version = version();
    const Pixelisation grid(job.nside);
    for (const SurveyInput& survey : job.surveys) {
        file.counts.surveys.push_back(
            count_survey(survey, grid, job.frame, ending_on_request(terminal.progress())));
        const SurveyCounts& counted = file.counts.surveys.back();
        terminal.say(fmt::format("Counted {}: {} of {} rows and {} of {} pixels kept.",
                                 counted.name,
                                 grouped(counted.cuts.rows_kept),
                                 grouped(counted.cuts.rows_read),
                                 grouped(counted.cuts.pixels_kept),
                                 grouped(counted.cuts.pixels_total)));
        for (const std::string& warning : counted.cuts.warnings)
            terminal.warn(fmt::format("{}: {}", counted.name, warning));
    }
    write_counts(folder / "counts.h5", file);
    return file;
}

CountsFile obtain_counts(const Job& job,
                         const InputRecord& inputs,
                         const fs::path& folder,
                         bool replace,
                         Terminal& terminal) {
    const fs::path path = folder / "counts.h5";
    if (fs::exists(path)) {
        CountsFile file = read_counts(path);
        if (file.digest == inputs.counts_digest) {
            terminal.say(
                fmt::format("Counts taken from {}: its inputs are unchanged.", path.string()));
            return file;
        }
        if (!replace)
            throw OutputError({path.string(),
                               "was made from other inputs or cuts",
                               "counts are used again only for the same inputs and cuts",
                               "give --replace to count anew, or another folder with -o"});
    }
    return make_counts(job, inputs, folder, terminal);
}

Outcome sample_into_chain(const Job& job,
                          const InputRecord& inputs,
                          const Counts& counts,
                          const fs::path& folder,
                          const CommandOptions& command,
                          Terminal& terminal) {
    const Posterior posterior(counts, job.model);
    EnsembleOptions options = job.ensemble;
    options.seed = job.seed;
    options.threads = command.n_threads();
    options.stop_requested = interrupt_requested;
    options.progress = terminal.progress();
    if (interrupt_requested()) throw Interrupted();
    if (command.replace) remove_results(folder, {"chains.h5", "summary.json", "summary.txt"});
    terminal.say(fmt::format("Sampling {} coordinates with {} ensembles of {} walkers.",
                             posterior.n_coordinates(),
                             options.replicates,
                             options.walkers_for(posterior.n_coordinates())));
    ChainWriter writer(folder / "chains.h5",
                       provenance_of(job, inputs),
                       posterior.parameters(),
                       posterior.vectors(),
                       counts,
                       options);
    const auto begin = std::chrono::steady_clock::now();
    const Outcome outcome = sample(posterior, options, writer);
    writer.finish(outcome, time_now());
    const std::chrono::duration<double> elapsed = std::chrono::steady_clock::now() - begin;
    report_outcome(outcome, elapsed.count(), terminal);
    return outcome;
}

Summary summarise_into(const Chain& chain,
                       const fs::path& folder,
                       int threads,
                       Terminal& terminal) {
    const Job job = job_of(chain);
    SummaryOptions options;
    options.title = job.title;
    options.seed = job.seed;
    options.cmb_velocity =
        cmb_velocity(cmb_prior(chain.provenance.companions, folder), job.frame);
    options.job_warnings = job.warnings;
    options.threads = threads;
    options.effective_draws_wanted = job.ensemble.effective_draws;
    const ParameterSpace space(chain.counts, job.model);
    Summary summary = summarise(chain, space, options);
    write_text(folder / "summary.json", to_json(summary));
    const std::string text = to_text(summary);
    write_text(folder / "summary.txt", text);
    terminal.say(text);
    terminal.say(fmt::format("Written: {} and summary.json beside it.",
                             (folder / "summary.txt").string()));
    return summary;
}

}  // namespace deviascope
