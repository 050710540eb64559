// SPDX-License-Identifier: GPL-2.0-or-later
// COUNTS (private): cuts on properties of a source
#pragma once

#include <cstddef>
#include <optional>
#include <string>
#include <vector>

#include "deviascope/catalogue/table.h"
#include "deviascope/counts/survey_input.h"

namespace deviascope {

/// A range of one column of the chunks that are read.
struct ColumnRange {
    std::size_t property = 0;  ///< index into RowSelection::properties
    std::size_t column = 0;    ///< index into RowSelection::columns
    double low = 0.0, high = 0.0;
    std::string label;  ///< `flux [10, 20)`
};

/// What a set of ranges says about a row.
struct Verdict {
    enum class Kind { inside, outside, missing } kind = Kind::inside;
    std::size_t range = 0;  ///< the one that is missed: `outside` the first outside, `missing`
                            ///< the first whose value is missing
};

/// Index of a name among `names`, put at their end where it is not there yet.
std::size_t index_among(std::vector<std::string>& names, const std::string& name);

/// The selections of a survey, with property names resolved to columns of a chunk.
struct RowSelection {
    explicit RowSelection(const SurveyInput& survey);

    std::vector<std::string> columns;     ///< names in the files; lon and lat come first
    std::size_t lon = 0, lat = 0;         ///< their indices
    std::vector<std::string> properties;  ///< those that are selected on, in order of mention
    std::vector<ColumnRange> survey;      ///< apply to every bin
    std::vector<std::vector<ColumnRange>> bins;  ///< n_bins; empty for bins with a count map
    std::vector<std::size_t> selecting_bins;     ///< bins that take rows of the catalogue
};

/// True where a row lies inside all ranges: `judge` for the common case, without branches.
inline bool holds(const std::vector<ColumnRange>& ranges,
                  const TableChunk& chunk,
                  std::size_t row) {
    bool all = true;
    for (const ColumnRange& range : ranges) {
        const double value = chunk.column[range.column][row];
        all = all & (value >= range.low) & (value < range.high);
    }
    return all;
}

/// Half-open ranges, all of which must hold. A missing value fails; `missing` is said only
/// where all values that are there lie inside.
Verdict judge(const std::vector<ColumnRange>& ranges, const TableChunk& chunk, std::size_t row);

}  // namespace deviascope
