// SPDX-License-Identifier: GPL-2.0-or-later
#include "app/commands.h"

#include <fmt/format.h>

#include <algorithm>
#include <utility>

#include "app/sample_step.h"
#include "app/steps.h"
#include "app/terminal.h"
#include "deviascope/chain/chain_file.h"
#include "deviascope/counts/count_maps.h"

namespace deviascope {

namespace fs = std::filesystem;

namespace {

/// Where a command on a job file writes by default: a folder named after the job, here.
fs::path folder_of(const CommandOptions& options) {
    if (!options.output.empty()) return options.output;
    return options.input.stem().string() + "-results";
}

Existing existing_of(const CommandOptions& options) {
    if (options.resume) return Existing::keep;
    return options.replace ? Existing::replace : Existing::refuse;
}

/// Everything up to a chain, as `run` and `sample` have it in common.
/// @param files  results that are made anew
Outcome make_chain(const CommandOptions& options,
                   const Job& job,
                   const ChainLock& lock,
                   const std::vector<std::string>& files,
                   Terminal& terminal) {
    const fs::path folder = lock.chain().parent_path();
    const Existing existing = existing_of(options);
    prepare_output(folder, files, existing);
    const InputRecord inputs = record_inputs(job, terminal);
    const Provenance provenance = provenance_of(job, inputs);
    StoredChain stored;
    if (options.resume) stored = find_stored_chain(lock, provenance, terminal);
    const bool counts_anew = existing != Existing::keep &&
                             std::find(files.begin(), files.end(), "counts.h5") != files.end();
    const CountsFile file = counts_anew
                                ? make_counts(job, inputs, folder, terminal)
                                : obtain_counts(job, inputs, folder, existing, terminal);
    return sample_into_chain(
        {job, file.counts, provenance, lock, options}, std::move(stored), terminal);
}

/// Where a job is sampled: the folder is made, and its chain locked.
ChainLock lock_output(const CommandOptions& options) {
    const fs::path folder = folder_of(options);
    make_folder(folder);
    return {folder / "chains.h5"};
}

ExitCode verdict(const Summary& summary, const CommandOptions& options) {
    return options.strict && !summary.warnings.empty() ? ExitCode::doubtful : ExitCode::done;
}

constexpr const char* maps_folder = "maps";

/// The files that --maps would write must not be there unasked.
void prepare_maps(const Job& job, const fs::path& folder, Existing existing) {
    std::vector<std::string> names;
    for (const SurveyInput& survey : job.surveys)
        for (const BinInput& bin : survey.bins)
            for (const fs::path& name : names_of_count_maps(survey.name, bin.name))
                names.push_back((maps_folder / name).string());
    prepare_output(folder, names, existing);
}

}  // namespace

ExitCode count_command(const CommandOptions& options) {
    Terminal terminal(options.quiet);
    const Job job = read_job(options.input);
    const fs::path folder = folder_of(options);
    prepare_output(folder, {"counts.h5"}, existing_of(options));
    if (options.maps) prepare_maps(job, folder, existing_of(options));
    const CountsFile file = make_counts(job, record_inputs(job, terminal), folder, terminal);
    for (const SurveyCounts& survey : file.counts.surveys)
        terminal.say(fmt::format("\n{}", cut_table(survey.name, survey.cuts)));
    terminal.say(fmt::format("Written: {}", (folder / "counts.h5").string()));
    if (options.maps) {
        write_count_maps(file.counts, folder / maps_folder);
        terminal.say(fmt::format("Written: counts and exposure of every bin as maps in {}",
                                 (folder / maps_folder).string()));
    }
    return ExitCode::done;
}

ExitCode sample_command(const CommandOptions& options) {
    Terminal terminal(options.quiet);
    const Job job = read_job(options.input);
    const ChainLock lock = lock_output(options);
    const Outcome outcome = make_chain(options, job, lock, {"chains.h5"}, terminal);
    if (outcome.end == Outcome::End::interrupted) return ExitCode::interrupted;
    const bool doubtful = outcome.end != Outcome::End::converged;
    return doubtful && options.strict ? ExitCode::doubtful : ExitCode::done;
}

ExitCode summarise_command(const CommandOptions& options) {
    Terminal terminal(options.quiet);
    const Chain chain = read_chain(options.input);
    const fs::path beside = options.input.has_parent_path() ? options.input.parent_path() : ".";
    const fs::path folder = options.output.empty() ? beside : options.output;
    prepare_output(folder, {"summary.json", "summary.txt"}, existing_of(options));
    return verdict(summarise_into(chain, folder, options.n_threads(), terminal), options);
}

ExitCode run_command(const CommandOptions& options) {
    Terminal terminal(options.quiet);
    const Job job = read_job(options.input);
    const ChainLock lock = lock_output(options);
    const Outcome outcome =
        make_chain(options,
                   job,
                   lock,
                   {"counts.h5", "chains.h5", "summary.json", "summary.txt"},
                   terminal);
    if (outcome.end == Outcome::End::interrupted) return ExitCode::interrupted;
    const Chain chain = read_chain(lock.chain());
    return verdict(
        summarise_into(chain, lock.chain().parent_path(), options.n_threads(), terminal),
        options);
}

}  // namespace deviascope
