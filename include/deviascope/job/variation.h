// SPDX-License-Identifier: GPL-2.0-or-later
// JOB: TOML to the options of the stages
#pragma once

#include <string>
#include <vector>

namespace deviascope {

/// A key of the job file and the values it shall take, one job each.
struct Variation {
    std::string path;                 ///< as written: `survey.dunlin.exclude.band`
    std::vector<std::string> values;  ///< TOML, or a plain word for a text
};

/// Reads `PATH=FIRST:LAST:STEP` or `PATH=VALUE,VALUE,…`.
/// FIRST:LAST:STEP are numbers, LAST included where the steps meet it to 1e-9 of a step.
/// Errors: UsageError (no `=`, no values, a step of 0 or in the wrong direction, more than
/// 1,000 values).
Variation parse_variation(const std::string& written);

/// The job's text with one value changed. Steps of the path are keys; among tables with names
/// (surveys, bins) a step is a name, or `all`; among nameless ones (exclusions) the change is
/// made in every one that has the key. A key that is absent from a table that is there is
/// added. Comments are not kept.
/// Errors: UsageError where the path leads nowhere.
std::string varied_text(const std::string& job_text,
                        const std::string& path,
                        const std::string& value);

}  // namespace deviascope
