// SPDX-License-Identifier: GPL-2.0-or-later
// The built program, on the job file of a folder.
#pragma once

#include <string>
#include <vector>

#include "run_process.h"
#include "temporary_folder.h"

namespace deviascope::test {

/// The words of `deviascope COMMAND FOLDER/job.toml`, with `-o FOLDER/OUTPUT` where one is
/// named, and more. Runs end without figures, which take as long as all the rest.
inline std::vector<std::string> words_on_job(const TemporaryFolder& folder,
                                             const std::string& command,
                                             const std::string& output,
                                             const std::vector<std::string>& more = {}) {
    std::vector<std::string> words{DEVIASCOPE_PROGRAM, command, (folder / "job.toml").string()};
    if (!output.empty()) words.insert(words.end(), {"-o", (folder / output).string()});
    words.insert(words.end(), more.begin(), more.end());
    if (command == "run") words.emplace_back("--no-figures");
    return words;
}

/// Runs a command that writes nothing.
inline ProcessResult run_on_job(const TemporaryFolder& folder,
                                const std::string& command,
                                const std::vector<std::string>& more = {}) {
    return run_process(words_on_job(folder, command, "", more));
}

/// Runs a command that writes, into the folder's `out`.
inline ProcessResult run_into_out(const TemporaryFolder& folder,
                                  const std::string& command,
                                  const std::vector<std::string>& more = {}) {
    return run_process(words_on_job(folder, command, "out", more));
}

}  // namespace deviascope::test
