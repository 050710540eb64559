// SPDX-License-Identifier: GPL-2.0-or-later
// JOB: TOML to the options of the stages
#pragma once

#include <vector>

#include "deviascope/job/job.h"

namespace deviascope {

/// A dispersion as it was measured for a bin that asked for it.
struct MeasuredDispersion {
    BinPlace place;
    double value = 1.0, sd = 0.0;
};

/// The name under which measured dispersions are kept among a job's companions.
inline constexpr const char* dispersion_file_name = "measured-dispersion.toml";

/// Measured dispersions as a text that a chain can keep.
Companion dispersion_file(const Job& job, const std::vector<MeasuredDispersion>& measured);

/// Puts measured dispersions in force and keeps their text among the job's companions.
/// Errors: UsageError where the text is none of this job.
void adopt_dispersion(Job& job, const Companion& file);

}  // namespace deviascope
