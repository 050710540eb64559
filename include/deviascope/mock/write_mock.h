// SPDX-License-Identifier: GPL-2.0-or-later
// MOCK: beside the flow; skies with known truth
#pragma once

#include <filesystem>
#include <string>
#include <vector>

#include "deviascope/mock/generate.h"

namespace deviascope {

/// What was written.
struct MockReport {
    std::vector<std::filesystem::path> files;  ///< catalogues and maps by survey, truth.toml
    std::vector<MockTally> tally;              ///< one a survey
    std::vector<std::string> warnings;
    bool finished = true;  ///< false: stopped; the survey being written left no file, and
                           ///< there is no truth.toml
};

/// Draws every survey of a scenario and writes into `folder` (made where missing): the
/// catalogues, the exposure maps made here, and `truth.toml`.
/// @param replace  whether existing files may be replaced
/// Errors: UsageError, InputError as draw_survey; OutputError if a file exists or cannot be
/// written. Each file is put in place when complete, truth.toml last.
MockReport write_mock(const Scenario& scenario,
                      const std::filesystem::path& folder,
                      const MockOptions& options,
                      bool replace);

/// The text of truth.toml: what the sky was made with and what became of its sources.
std::string truth_text(const Scenario& scenario, const std::vector<MockTally>& tally);

}  // namespace deviascope
