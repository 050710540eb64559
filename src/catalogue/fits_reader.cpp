// SPDX-License-Identifier: GPL-2.0-or-later
#include "catalogue/fits_reader.h"

#include <fmt/format.h>

#include <algorithm>
#include <span>

#include "catalogue/column_match.h"
#include "catalogue/reading.h"
#include "deviascope/core/error.h"

namespace deviascope {

namespace {

/// One number a row is all that a catalogue column may hold.
void check_column(const std::filesystem::path& path, const fits::Column& column) {
    if (column.is_numeric && column.repeat == 1) return;
    const std::string found = !column.is_numeric ? "does not hold real numbers"
                              : column.repeat == 0
                                  ? std::string("holds arrays of varying length")
                                  : fmt::format("holds {} values a row", column.repeat);
    throw InputError({fmt::format("{}: column {}", path.string(), column.name),
                      fmt::format("it {} (TFORM {})", found, column.form),
                      "a column with one integer, real or logical value a row",
                      "name another column"});
}

}  // namespace

FitsReader::FitsReader(const std::filesystem::path& path,
                       const std::optional<std::string>& table,
                       const std::vector<std::string>& columns)
    : table_(path, table) {
    std::vector<std::string> names;
    for (const fits::Column& column : table_.columns()) names.push_back(column.name);
    for (const std::string& name : columns) {
        wanted_.push_back(table_.columns()[match_column(path, name, names)]);
        check_column(path, wanted_.back());
    }
}

/// Column after column is read in pieces that fit the library's buffers, so that wide rows are
/// not fetched once a column.
bool FitsReader::next(TableChunk& chunk) {
    const std::int64_t n = std::min(rows_per_chunk, table_.n_rows() - n_read_);
    chunk.first_row = n_read_;
    chunk.column.resize(wanted_.size());
    for (auto& column : chunk.column) column.resize(static_cast<std::size_t>(n));
    const std::int64_t step = std::max<std::int64_t>(1, table_.rows_at_a_time());
    for (std::int64_t first = 0; first < n; first += step) {
        const auto piece = static_cast<std::size_t>(std::min(step, n - first));
        for (std::size_t i = 0; i < wanted_.size(); ++i) {
            const std::span<double> all(chunk.column[i]);
            table_.read(wanted_[i],
                        n_read_ + first,
                        all.subspan(static_cast<std::size_t>(first), piece));
        }
    }
    n_read_ += n;
    return n > 0;
}

std::string FitsReader::place_of_row(std::int64_t row) const {
    return fmt::format("row {}", row + 1);
}

}  // namespace deviascope
