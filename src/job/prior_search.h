// SPDX-License-Identifier: GPL-2.0-or-later
// JOB: TOML to the options of the stages
#pragma once

#include <filesystem>
#include <string>
#include <vector>

namespace deviascope {

/// Folders in which prior files are looked for, in that order: the job's, its `priors/`,
/// `../share/deviascope/priors` of the program, the source tree it was built from.
std::vector<std::filesystem::path> prior_folders(const std::filesystem::path& job_folder);

/// Names of the prior files in all but the first of these folders (beside the job lie other
/// TOML files too), sorted.
std::vector<std::string> known_priors(const std::filesystem::path& job_folder);

}  // namespace deviascope
