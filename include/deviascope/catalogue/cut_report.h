// SPDX-License-Identifier: GPL-2.0-or-later
// CATALOGUE -> counts
#pragma once

#include <cstdint>
#include <string>
#include <vector>

namespace deviascope {

/// One line of the table of cuts: what a cut found and what it removed.
struct CutLine {
    std::string name;                 ///< in the job file's words
    std::int64_t rows_removed = 0;    ///< catalogue rows, and sources of count maps
    std::int64_t pixels_removed = 0;  ///< pixels of the job's grid
};

/// Per survey: how many rows and pixels each cut removed, in the order in which they act (what
/// an earlier cut removed is not counted again), so that the table adds up:
///   rows_read = sum of rows_removed + rows_kept,  pixels_total = sum of pixels_removed +
///   pixels_kept.
struct CutReport {
    std::int64_t rows_read = 0;
    std::int64_t rows_kept = 0;  ///< in one bin of the survey
    std::int64_t pixels_total = 0;
    std::int64_t pixels_kept = 0;
    std::vector<CutLine> cuts;
    std::vector<std::string> warnings;  ///< for instance an exclusion that removed nothing
};

}  // namespace deviascope
