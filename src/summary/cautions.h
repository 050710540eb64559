// SPDX-License-Identifier: GPL-2.0-or-later
// chain -> SUMMARY -> figures
#pragma once

#include "deviascope/summary/summary.h"

namespace deviascope {

/// Everything a reader must be told in plain words before believing the numbers, the gravest
/// first: sampling, separation, what amplitudes owe to their priors, then what earlier stages
/// reported.
std::vector<std::string> cautions_of(const Summary& summary,
                                     const ParameterSpace& space,
                                     const SummaryOptions& options);

}  // namespace deviascope
