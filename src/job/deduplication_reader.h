// SPDX-License-Identifier: GPL-2.0-or-later
// JOB: TOML to the options of the stages
#pragma once

#include <vector>

#include "deviascope/counts/survey_input.h"
#include "deviascope/job/job.h"
#include "job/toml_reader.h"

namespace deviascope {

/// `deduplicate` of the job table: texts `FIRST over SECOND`. Faults: another form, a survey
/// that is not there or has no positions (count maps alone), a survey that would depend on
/// itself.
std::vector<Deduplication> read_deduplication(const TomlTable& job,
                                              const std::vector<SurveyInput>& surveys);

}  // namespace deviascope
