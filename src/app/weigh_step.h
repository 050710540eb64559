// SPDX-License-Identifier: GPL-2.0-or-later
// APP: on top of all stages
#pragma once

#include <filesystem>
#include <string>
#include <vector>

#include "app/output_folder.h"
#include "app/steps.h"
#include "app/terminal.h"
#include "deviascope/job/job.h"

namespace deviascope {

/// Speed of the full-sky experiment that `weigh --check` makes, units of c. 0.05: the dipole of
/// a bin then stands far out of the noise of a million sources, and properties move by less
/// than the windows at the edges are wide.
inline constexpr double experiment_speed = 0.05;

struct WeighStep {
    const Job& job;
    const InputRecord& inputs;
    int threads = 1;
    double experiment_speed = 0.0;  ///< 0: no experiment
};

/// `<survey>-weights.toml` of each survey whose weights the job asks to be measured.
std::vector<std::string> names_of_weights_files(const Job& job);
/// The same of one survey.
std::string name_of_weights_file(const std::string& survey);

/// catalogue -> weights: measures one survey, says so, and warns; writes nothing.
/// @return the text of its weights file. Errors: Interrupted while the catalogue is read.
std::string weigh_survey(const WeighStep& step, std::size_t survey, Terminal& terminal);

/// The job with every weight it asks to be measured: taken from the folder's weights files
/// where they fit its inputs, else measured and written there. Errors: where a file is there
/// that does not fit, and is not to be replaced: OutputError, or UsageError where it was to be
/// kept. An empty folder: measures, and writes nothing.
/// @param anew  measures even where a file fits
Job with_measured_weights(const WeighStep& step,
                          const std::filesystem::path& folder,
                          Existing existing,
                          bool anew,
                          Terminal& terminal);

/// The same, always measured and never written; a job that asks for nothing is left as it is.
Job weighed(const Job& job, int threads, Terminal& terminal);

}  // namespace deviascope
