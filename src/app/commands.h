// SPDX-License-Identifier: GPL-2.0-or-later
// APP: on top of all stages
#pragma once

#include <filesystem>
#include <string>
#include <vector>

#include "deviascope/core/error.h"
#include "deviascope/core/parallel.h"

namespace deviascope {

/// What the command line of any command can say.
struct CommandOptions {
    std::filesystem::path input;   ///< job, scenario or chain
    std::filesystem::path output;  ///< folder; empty: the command's own default
    int threads = 0;               ///< 0: as many as the machine offers
    bool quiet = false;
    bool replace = false;
    bool resume = false;
    bool strict = false;
    bool maps = false;
    bool experiment = false;                 ///< of `weigh`: --check
    std::string reference = "cmb-velocity";  ///< name of a prior
    std::string clustering;                  ///< name of a prior; empty: none
    std::vector<std::string> vary;           ///< PATH=VALUES of a sweep
    std::string width = "180mm";             ///< of figures
    bool bare = false;                       ///< figures without titles
    bool draws = true;                       ///< `run` ends with figures and report
    std::filesystem::path font;
    std::vector<std::string> only;        ///< figures; empty: all, with the report
    std::vector<std::string> parameters;  ///< of the joint figure
    std::vector<std::string> formats;     ///< of exported draws
    int thin = 1;                         ///< every how many stored rows are exported
    int rows_per_block = 0;               ///< rows stored at a time; 0: by the clock

    /// Threads to use.
    int n_threads() const { return threads > 0 ? threads : default_threads(); }
};

/// One function a command; each returns the exit code of a run that did not fail.
ExitCode run_command(const CommandOptions& options);
ExitCode check_command(const CommandOptions& options);
ExitCode count_command(const CommandOptions& options);
ExitCode weigh_command(const CommandOptions& options);
ExitCode sample_command(const CommandOptions& options);
ExitCode summarise_command(const CommandOptions& options);
ExitCode figures_command(const CommandOptions& options);
ExitCode export_command(const CommandOptions& options);
ExitCode mock_command(const CommandOptions& options);
ExitCode compare_command(const CommandOptions& options);
ExitCode sweep_command(const CommandOptions& options);

}  // namespace deviascope
