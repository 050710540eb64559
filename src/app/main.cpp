// SPDX-License-Identifier: GPL-2.0-or-later
// APP: the command line, and the one place that turns errors into exit codes
#include <fmt/format.h>
#include <fmt/ranges.h>

#include <CLI/CLI.hpp>
#include <algorithm>
#include <cerrno>
#include <cstdio>
#include <cstring>
#include <exception>
#include <functional>
#include <new>
#include <stdexcept>
#include <string>

#include "app/commands.h"
#include "app/interrupt.h"
#include "app/terminal.h"
#include "core/fits/fits_file.h"
#include "core/gzip/byte_source.h"
#include "deviascope/chain/chain.h"
#include "deviascope/core/error.h"
#include "deviascope/core/nearest_name.h"
#include "deviascope/core/version.h"
#include "deviascope/figures/figures.h"
#include "deviascope/sky/library_versions.h"

namespace {

using deviascope::CommandOptions;
using deviascope::ExitCode;
using Action = std::function<ExitCode(const CommandOptions&)>;

/// A command as the table below describes it; what it does not take is left out there.
struct Command {
    const char* name;
    const char* description;
    const char* input = "JOB.toml";  ///< name of its argument
    const char* input_description = "job file (TOML)";
    /// Null where it writes nothing.
    const char* output_description =
        "folder for the results; default: the job's name with -results, here";
    bool resume = false;  ///< takes --resume
    bool strict = false;  ///< takes --strict
    Action action;
    /// Adds options of its own; null: it has none.
    void (*add_options)(CLI::App&, CommandOptions&) = nullptr;
};

void add_run_options(CLI::App& command, CommandOptions& options) {
    command.add_flag(
        "!--no-figures",
        options.draws,
        "no figures, report, tables and sky files: the chain and its summary alone");
}

void add_count_options(CLI::App& command, CommandOptions& options) {
    command.add_flag("--maps",
                     options.maps,
                     "write the counts and exposure of every bin as HEALPix maps too");
}

void add_weigh_options(CLI::App& command, CommandOptions& options) {
    command.add_flag(
        "--check", options.experiment, "check the weights by an experiment on the full sky");
}

void add_compare_options(CLI::App& command, CommandOptions& options) {
    command
        .add_option("--reference",
                    options.reference,
                    "prior with the velocity to compare with; default: cmb-velocity")
        ->option_text("NAME");
    command
        .add_option("--clustering",
                    options.clustering,
                    "prior of dipoles by clustering, to hold the intrinsic ones against")
        ->option_text("NAME");
}

void add_sweep_options(CLI::App& command, CommandOptions& options) {
    command
        .add_option("--vary",
                    options.vary,
                    "key and values: PATH=FIRST:LAST:STEP or PATH=VALUE,VALUE; may be repeated")
        ->required()
        ->take_all()
        ->expected(1)
        ->option_text("PATH=VALUES");
}

void add_figure_options(CLI::App& command, CommandOptions& options) {
    command
        .add_option("--only",
                    options.only,
                    "only these figures (names, or their beginnings), and no report")
        ->delimiter(',')
        ->option_text("NAME,…");
    command
        .add_option("--width", options.width, "90mm for a column, 180mm for a page (default)")
        ->option_text("MM");
    command.add_flag("--bare", options.bare, "no titles");
    command
        .add_option(
            "--parameters", options.parameters, "of the joint figure, such as velocity.x")
        ->delimiter(',')
        ->option_text("NAME,…");
    command.add_option("--font", options.font, "font file in place of Open Sans")
        ->option_text("FILE");
}

void add_export_options(CLI::App& command, CommandOptions& options) {
    command.add_option("--format", options.formats, "fits (default), csv, csv.gz")
        ->delimiter(',')
        ->check(CLI::IsMember({"fits", "csv", "csv.gz"}))
        ->default_val(std::vector<std::string>{"fits"})
        ->option_text("FORMAT,…");
    command.add_option("--thin", options.thin, "every N-th stored row only")
        ->check(CLI::Range(1, 1'000'000'000))
        ->option_text("N");
}

// NOLINTNEXTLINE(readability-function-size): a table
std::vector<Command> commands() {
    return {
        {.name = "run",
         .description = "The whole job: counts, samples, summarises and draws",
         .resume = true,
         .strict = true,
         .action = deviascope::run_command,
         .add_options = add_run_options},
        {.name = "check",
         .description =
             "Checks a job and its inputs, and says what would be done; writes nothing",
         .output_description = nullptr,
         .strict = true,
         .action = deviascope::check_command},
        {.name = "count",
         .description = "Counts the sources of every survey into counts.h5",
         .action = deviascope::count_command,
         .add_options = add_count_options},
        {.name = "weigh",
         .description = "Measures the kinematic weights of bins from the catalogues themselves",
         .action = deviascope::weigh_command,
         .add_options = add_weigh_options},
        {.name = "sample",
         .description =
             "Samples the posterior into chains.h5, from the folder's counts.h5 if it fits",
         .resume = true,
         .strict = true,
         .action = deviascope::sample_command},
        {.name = "summarise",
         .description = "Summarises a chain into summary.json and summary.txt",
         .input = "chains.h5",
         .input_description = "chain file",
         .output_description = "folder for the summary; default: beside the chain",
         .strict = true,
         .action = deviascope::summarise_command},
        {.name = "figures",
         .description = "Draws figures, and makes report, tables and sky files from a chain",
         .input = "chains.h5",
         .input_description = "chain file",
         .output_description = "folder for the results; default: beside the chain",
         .strict = true,
         .action = deviascope::figures_command,
         .add_options = add_figure_options},
        {.name = "export",
         .description = "Writes the draws of a chain as a FITS or CSV table",
         .input = "chains.h5",
         .input_description = "chain file",
         .output_description =
             "folder for draws.fits, draws.csv, draws.csv.gz; default: beside the chain",
         .action = deviascope::export_command,
         .add_options = add_export_options},
        {.name = "compare",
         .description = "Holds the posterior against a reference velocity, rival hypotheses, "
                        "each survey, and the counts",
         .strict = true,
         .action = deviascope::compare_command,
         .add_options = add_compare_options},
        {.name = "sweep",
         .description =
             "Runs the job again with other cuts, masks, priors or resolutions, one row each",
         .strict = true,
         .action = deviascope::sweep_command,
         .add_options = add_sweep_options},
        {.name = "mock",
         .description = "Makes mock catalogues with known truth",
         .input = "SCENARIO.toml",
         .input_description = "scenario file (TOML)",
         .output_description = "folder for the catalogues; default: the scenario's name, here",
         .action = deviascope::mock_command},
    };
}

void add_command(CLI::App& program,
                 const Command& command,
                 CommandOptions& options,
                 Action& chosen) {
    CLI::App* sub = program.add_subcommand(command.name, command.description);
    sub->add_option(command.input, options.input, command.input_description)
        ->required()
        ->option_text(" ");
    CLI::Option* replace = nullptr;
    if (command.output_description != nullptr) {
        sub->add_option("-o,--output", options.output, command.output_description)
            ->option_text("DIR");
        replace = sub->add_flag("--replace", options.replace, "overwrite results that exist");
    }
    sub->add_option(
           "--threads", options.threads, "threads to use; the results do not depend on it")
        ->check(CLI::Range(1, 4096))
        ->option_text("N");
    sub->add_flag("--quiet", options.quiet, "no progress and no report; warnings remain");
    if (command.resume) {
        sub->add_flag("--resume",
                      options.resume,
                      "go on with a run that was cut off; it ends as if it had not been")
            ->excludes(replace);
        // For tests, and left out of the help: blocks that do not end by the clock.
        sub->add_option("--rows-per-block", options.rows_per_block)
            ->check(CLI::Range(1, 1'000'000))
            ->group("");
    }
    if (command.strict)
        sub->add_flag("--strict", options.strict, "exit with 6 where the result is doubtful");
    if (command.add_options != nullptr) command.add_options(*sub, options);
    sub->callback([&chosen, action = command.action] { chosen = action; });
}

int fail(ExitCode code, const std::string& text) {
    std::fprintf(stderr, "deviascope: %s\n", text.c_str());
    return static_cast<int>(code);
}

/// What was said must have arrived, unless its reader chose to leave.
int after_last_word(int code) {
    const int reason = deviascope::Terminal::output_failure();
    if (reason == 0 || reason == EPIPE || code != 0) return code;
    return fail(
        ExitCode::output,
        fmt::format("standard output: cannot be written ({}); an open terminal, file or "
                    "pipe; results are complete, their report is not",
                    std::strerror(reason)));
}

/// Refuses a first word that is no command, with the nearest one: the parser would only say
/// that a command is missing.
void refuse_unknown_command(int argc, char** argv) {
    if (argc < 2 || argv[1][0] == '-') return;
    std::vector<std::string> known;
    for (const Command& command : commands()) known.emplace_back(command.name);
    if (std::find(known.begin(), known.end(), argv[1]) != known.end()) return;
    const std::string nearest = deviascope::nearest_name(argv[1], known);
    throw deviascope::UsageError(
        {"command line",
         fmt::format("there is no command \"{}\"", argv[1]),
         fmt::format("the commands are {}", fmt::join(known, ", ")),
         nearest.empty() ? "see deviascope --help" : fmt::format("did you mean {}?", nearest)});
}

int parse_and_act(int argc, char** argv) {
    CLI::App program{
        "Tells the observer's velocity and an intrinsic dipole apart in counts of distant "
        "sources.",
        "deviascope"};
    program.require_subcommand(1);
    program.set_version_flag("--version", [] {
        return fmt::format("deviascope {}\nwith {}, {}, {}, {}, {}",
                           deviascope::version(),
                           deviascope::library_versions(),
                           deviascope::fits::library_version(),
                           deviascope::sky_library_versions(),
                           deviascope::gzip_library_version(),
                           deviascope::drawing_library_versions());
    });
    program.footer(
        "Exit codes: 0 done; 2 wrong command line or job file; 3 bad input data; 4 numerics "
        "cannot\n"
        "go on; 5 cannot write; 6 doubtful (--strict); 70 a fault of ours; 130 interrupted\n"
        "(go on with --resume).");
    refuse_unknown_command(argc, argv);
    CommandOptions options;
    Action chosen;
    for (const Command& command : commands()) add_command(program, command, options, chosen);
    try {
        program.parse(argc, argv);
    } catch (const CLI::ParseError& error) {
        if (error.get_exit_code() == 0) return program.exit(error);
        return fail(ExitCode::usage,
                    std::string("command line: ") + error.what() + "; see deviascope --help");
    }
    return static_cast<int>(chosen(options));
}

int not_enough_memory() {
    return fail(ExitCode::numerics,
                "memory: there is not enough; a lower nside, fewer replicates or fewer walkers "
                "need less");
}

}  // namespace

int main(int argc, char** argv) {
    deviascope::watch_for_interrupts();
    try {
        return after_last_word(parse_and_act(argc, argv));
    } catch (const deviascope::Error& error) {
        return fail(error.exit_code(), error.what());
    } catch (const deviascope::Interrupted&) {
        return fail(ExitCode::interrupted,
                    "interrupted before sampling began; nothing was stored");
    } catch (const std::bad_alloc&) {
        return not_enough_memory();
    } catch (const std::length_error&) {
        return not_enough_memory();
    } catch (const std::exception& error) {
        return fail(ExitCode::internal,
                    std::string("an unexpected fault: ") + error.what() +
                        "; please report it with the job file");
    }
}
