// SPDX-License-Identifier: GPL-2.0-or-later
// chain -> SUMMARY -> figures
#pragma once

#include <cstdint>
#include <string>

#include "deviascope/summary/summary.h"

namespace deviascope {

/// Sources of all bins.
std::int64_t total_sources(const Summary& summary);

/// `1 bin`, `3 bins`.
std::string count_of(std::size_t n, const std::string& one, const std::string& many);

/// `5 474 436 sources in 7 bins of 2 surveys`.
std::string counted_words(const Summary& summary);

}  // namespace deviascope
