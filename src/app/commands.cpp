// SPDX-License-Identifier: GPL-2.0-or-later
#include "app/commands.h"

#include <fmt/format.h>

#include <algorithm>
#include <charconv>
#include <iterator>
#include <utility>

#include "app/figure_step.h"
#include "app/sample_step.h"
#include "app/steps.h"
#include "app/terminal.h"
#include "app/weigh_step.h"
#include "deviascope/chain/chain_file.h"
#include "deviascope/chain/export_draws.h"
#include "deviascope/core/grouped_number.h"
#include "deviascope/counts/count_maps.h"

namespace deviascope {

namespace fs = std::filesystem;

namespace {

/// What was measured on the way belongs to where the chain comes from.
void keep_companions(const Job& job, Provenance& provenance) {
    for (const Companion& companion : job.companions)
        if (std::ranges::find(provenance.companions, companion.name, &Companion::name) ==
            provenance.companions.end())
            provenance.companions.push_back(companion);
}

/// Everything up to a chain, as `run` and `sample` have it in common.
/// @param files  results that are made anew, besides measured weights where counts are
Outcome make_chain(const CommandOptions& options,
                   const Job& written,
                   const ChainLock& lock,
                   std::vector<std::string> files,
                   Terminal& terminal) {
    const fs::path folder = lock.chain().parent_path();
    const Existing existing = existing_of(options);
    const bool counts_anew = existing != Existing::keep &&
                             std::find(files.begin(), files.end(), "counts.h5") != files.end();
    if (counts_anew)
        std::ranges::copy(names_of_weights_files(written), std::back_inserter(files));
    prepare_output(folder, files, existing);
    const InputRecord inputs = record_inputs(written, terminal);
    Job job = with_measured_weights(
        {written, inputs, options.n_threads()}, folder, existing, counts_anew, terminal);
    Provenance provenance = provenance_of(job, inputs);
    StoredChain stored;
    if (options.resume) stored = find_stored_chain(lock, provenance, terminal);
    const CountsFile file = counts_anew
                                ? make_counts(job, inputs, folder, terminal)
                                : obtain_counts(job, inputs, folder, existing, terminal);
    measure_dispersions(job, file.counts, terminal);
    keep_companions(job, provenance);
    return sample_into_chain(
        {job, file.counts, provenance, lock, options}, std::move(stored), terminal);
}

/// Where a job is sampled: the folder is made, and its chain locked.
ChainLock lock_output(const CommandOptions& options) {
    const fs::path folder = folder_of(options);
    make_folder(folder);
    return {folder / "chains.h5"};
}

/// Where a command on a chain writes by default: beside it.
fs::path folder_beside(const CommandOptions& options) {
    if (!options.output.empty()) return options.output;
    return options.input.has_parent_path() ? options.input.parent_path() : ".";
}

/// Millimetres of a width as the command line says it: `90mm`, or `90`.
double millimetres_of(const std::string& width) {
    double value = 0.0;
    const auto [end, error] = std::from_chars(width.data(), width.data() + width.size(), value);
    const std::string_view unit(end, std::size_t(width.data() + width.size() - end));
    if (error == std::errc() && (unit.empty() || unit == "mm")) return value;
    throw UsageError({"--width",
                      fmt::format("\"{}\"", width),
                      "a length in millimetres, such as 90mm or 180mm",
                      ""});
}

FigureOptions figure_options_of(const CommandOptions& options) {
    FigureOptions figures;
    figures.width_mm = millimetres_of(options.width);
    figures.bare = options.bare;
    figures.font = options.font;
    figures.only = options.only;
    figures.parameters = options.parameters;
    figures.threads = options.n_threads();
    if (const auto problems = figures.problems(); !problems.empty()) throw UsageError(problems);
    return figures;
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

namespace {

/// Surveys whose weights the job asks to be measured; where it asks for none, all that can be.
std::vector<std::size_t> surveys_to_weigh(const Job& job) {
    std::vector<std::size_t> asked, possible;
    for (std::size_t s = 0; s < job.surveys.size(); ++s) {
        if (job.weighing[s].bins.empty()) continue;
        possible.push_back(s);
        if (job.weighing[s].asked_for) asked.push_back(s);
    }
    if (possible.empty())
        throw UsageError(
            {job.name,
             "no survey has bins whose weights can be measured",
             "bins that select from a catalogue, without a weight of their own where "
             "weights = \"measure\"",
             ""});
    return asked.empty() ? possible : asked;
}

}  // namespace

ExitCode weigh_command(const CommandOptions& options) {
    Terminal terminal(options.quiet);
    const Job job = read_job_to_weigh(options.input);
    const fs::path folder = folder_of(options);
    const std::vector<std::size_t> surveys = surveys_to_weigh(job);
    std::vector<std::string> names;
    for (const std::size_t s : surveys)
        names.push_back(name_of_weights_file(job.surveys[s].name));
    prepare_output(folder, names, existing_of(options));
    const InputRecord inputs = record_inputs(job, terminal);
    const WeighStep step{
        job, inputs, options.n_threads(), options.experiment ? experiment_speed : 0.0};
    for (std::size_t i = 0; i < surveys.size(); ++i) {
        write_text(folder / names[i], weigh_survey(step, surveys[i], terminal));
        terminal.say(fmt::format("Written: {}", (folder / names[i]).string()));
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
    const fs::path folder = folder_beside(options);
    prepare_output(folder, {"summary.json", "summary.txt"}, existing_of(options));
    return verdict(summarise_into(chain, folder, options.n_threads(), terminal).summary,
                   options);
}

ExitCode figures_command(const CommandOptions& options) {
    Terminal terminal(options.quiet);
    const FigureOptions figures = figure_options_of(options);
    const Chain chain = read_chain(options.input);
    const fs::path folder = folder_beside(options);
    if (figures.only.empty())
        prepare_output(folder, first_drawn_results(folder), existing_of(options));
    const Summarised result = summarised(chain, folder, options.n_threads());
    const ChainResults results{
        chain, result, comparison_beside(options.input, chain.provenance, terminal)};
    if (figures.only.empty())
        write_results(results, figures, folder, terminal);
    else
        write_chosen_figures(results, figures, folder, existing_of(options), terminal);
    return verdict(result.summary, options);
}

ExitCode export_command(const CommandOptions& options) {
    Terminal terminal(options.quiet);
    const Chain chain = read_chain(options.input);
    const fs::path folder = folder_beside(options);
    std::vector<std::string> names;
    for (const std::string& format : options.formats) names.push_back("draws." + format);
    prepare_output(folder, names, existing_of(options));
    for (const std::string& name : names) {
        const std::int64_t rows = export_draws(chain, folder / name, options.thin);
        terminal.say(
            fmt::format("Written: {}, {} draws", (folder / name).string(), grouped(rows)));
    }
    return ExitCode::done;
}

ExitCode run_command(const CommandOptions& options) {
    Terminal terminal(options.quiet);
    const Job job = read_job(options.input);
    const ChainLock lock = lock_output(options);
    std::vector<std::string> files{"counts.h5", "chains.h5", "summary.json", "summary.txt"};
    std::ranges::copy(first_drawn_results(folder_of(options)), std::back_inserter(files));
    if (options.draws) require_fonts({});
    const Outcome outcome = make_chain(options, job, lock, files, terminal);
    if (outcome.end == Outcome::End::interrupted) return ExitCode::interrupted;
    const Chain chain = read_chain(lock.chain());
    const fs::path folder = lock.chain().parent_path();
    const Summarised result = summarise_into(chain, folder, options.n_threads(), terminal);
    if (!options.draws) return verdict(result.summary, options);
    FigureOptions figures;
    figures.threads = options.n_threads();
    write_results({chain, result, comparison_beside(lock.chain(), chain.provenance, terminal)},
                  figures,
                  folder,
                  terminal);
    return verdict(result.summary, options);
}

}  // namespace deviascope
