// SPDX-License-Identifier: GPL-2.0-or-later
// COUNTS (private): the lines of the table of cuts, in the order in which they act
#pragma once

#include <cstddef>
#include <vector>

#include "counts/row_selection.h"
#include "counts/sky_cuts.h"
#include "deviascope/catalogue/cut_report.h"
#include "deviascope/counts/count_sources.h"

namespace deviascope {

/// A CutReport that is being filled, and the numbers of its lines.
struct CutTable {
    CutTable(const SurveyInput& input,
             const RowSelection& selection,
             const SkyCuts& sky,
             const std::vector<Duplicates>& duplicates);

    void remove_rows(std::size_t line, std::int64_t n = 1) {
        report.cuts[line].rows_removed += n;
    }
    /// The finished report. Errors: InternalError unless rows and pixels add up.
    CutReport finished() const;

    CutReport report;
    std::size_t position = 0;
    std::vector<std::size_t> select;   ///< of each range of the survey
    std::vector<std::size_t> missing;  ///< of each selected property
    std::size_t first_sky_cut = 0;     ///< add SkyCuts::removed_by
    std::size_t hole = 0;
    std::size_t no_bin = 0;
    std::vector<std::size_t> bin_exposure;  ///< of each bin
    std::vector<std::size_t> duplicate;     ///< of each survey of `duplicates`

  private:
    std::size_t add_line(const std::string& name);
    void add_missing(const RowSelection& selection, std::size_t property);
    void count_pixels(const SkyCuts& sky);
};

}  // namespace deviascope
