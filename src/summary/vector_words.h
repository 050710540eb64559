// SPDX-License-Identifier: GPL-2.0-or-later
// chain -> SUMMARY -> figures
#pragma once

#include <string>

#include "deviascope/summary/summary.h"

namespace deviascope {

/// `velocity`, `intrinsic dipole` (of all surveys together), `intrinsic dipole of dunlin`.
std::string name_of(const VectorSummary& vector);

/// The upper limit of an amplitude that is not told from zero: `412 km/s`, `2.4 x 10^-3`.
std::string limit_in_words(const VectorSummary& vector);

}  // namespace deviascope
