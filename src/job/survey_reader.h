// SPDX-License-Identifier: GPL-2.0-or-later
// JOB: TOML to the options of the stages
#pragma once

#include <optional>
#include <string>
#include <vector>

#include "deviascope/counts/survey_input.h"
#include "deviascope/job/job.h"
#include "deviascope/model/model_options.h"
#include "job/name_rule.h"
#include "job/surroundings.h"
#include "job/toml_reader.h"

namespace deviascope {

/// One `[[survey]]`, read.
struct SurveyReading {
    SurveyInput input;
    SurveyModel model;
    SurveyWeighing weighing;
    std::vector<std::string> warnings;
    std::vector<std::size_t> measure_dispersion;  ///< bins that ask for it
    bool model_complete = true;  ///< false where a fault leaves weights or prior unknown
};

/// @param names             of the surveys so far
/// @param intrinsic         prior of surveys without one of their own; empty where it is faulty
/// @param intrinsic_shared  one vector for all: a survey's own prior is refused
SurveyReading read_survey(const TomlTable& table,
                          NameRule& names,
                          const std::optional<VectorPrior>& intrinsic,
                          bool intrinsic_shared,
                          Frame job_frame,
                          Surroundings& surroundings);

}  // namespace deviascope
