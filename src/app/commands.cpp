// SPDX-License-Identifier: GPL-2.0-or-later
#include "app/commands.h"

#include <fmt/format.h>

#include "app/output_folder.h"
#include "app/steps.h"
#include "app/terminal.h"
#include "deviascope/chain/chain_file.h"

namespace deviascope {

namespace fs = std::filesystem;

namespace {

/// Where a command on a job file writes by default: a folder named after the job, here.
fs::path folder_of(const CommandOptions& options) {
    if (!options.output.empty()) return options.output;
    return options.input.stem().string() + "-results";
}

ExitCode verdict(const Summary& summary, const CommandOptions& options) {
    return options.strict && !summary.warnings.empty() ? ExitCode::doubtful : ExitCode::done;
}

}  // namespace

ExitCode count_command(const CommandOptions& options) {
    Terminal terminal(options.quiet);
    const Job job = read_job(options.input);
    const fs::path folder = folder_of(options);
    prepare_output(folder, {"counts.h5"}, options.replace);
    const CountsFile file = make_counts(job, record_inputs(job, terminal), folder, terminal);
    for (const SurveyCounts& survey : file.counts.surveys)
        terminal.say(fmt::format("\n{}", cut_table(survey.name, survey.cuts)));
    terminal.say(fmt::format("Written: {}", (folder / "counts.h5").string()));
    return ExitCode::done;
}

ExitCode sample_command(const CommandOptions& options) {
    Terminal terminal(options.quiet);
    const Job job = read_job(options.input);
    const fs::path folder = folder_of(options);
    prepare_output(folder, {"chains.h5"}, options.replace);
    const InputRecord inputs = record_inputs(job, terminal);
    const CountsFile file = obtain_counts(job, inputs, folder, options.replace, terminal);
    const Outcome outcome =
        sample_into_chain(job, inputs, file.counts, folder, options, terminal);
    if (outcome.end == Outcome::End::interrupted) return ExitCode::interrupted;
    const bool doubtful = outcome.end != Outcome::End::converged;
    return doubtful && options.strict ? ExitCode::doubtful : ExitCode::done;
}

ExitCode summarise_command(const CommandOptions& options) {
    Terminal terminal(options.quiet);
    const Chain chain = read_chain(options.input);
    const fs::path beside = options.input.has_parent_path() ? options.input.parent_path() : ".";
    const fs::path folder = options.output.empty() ? beside : options.output;
    prepare_output(folder, {"summary.json", "summary.txt"}, options.replace);
    return verdict(summarise_into(chain, folder, options.n_threads(), terminal), options);
}

ExitCode run_command(const CommandOptions& options) {
    Terminal terminal(options.quiet);
    const Job job = read_job(options.input);
    const fs::path folder = folder_of(options);
    prepare_output(
        folder, {"counts.h5", "chains.h5", "summary.json", "summary.txt"}, options.replace);
    const InputRecord inputs = record_inputs(job, terminal);
    const CountsFile file = make_counts(job, inputs, folder, terminal);
    const Outcome outcome =
        sample_into_chain(job, inputs, file.counts, folder, options, terminal);
    if (outcome.end == Outcome::End::interrupted) return ExitCode::interrupted;
    const Chain chain = read_chain(folder / "chains.h5");
    return verdict(summarise_into(chain, folder, options.n_threads(), terminal), options);
}

}  // namespace deviascope
