// SPDX-License-Identifier: GPL-2.0-or-later
// CATALOGUE -> counts
#pragma once

#include <cstdint>
#include <filesystem>
#include <memory>
#include <optional>
#include <string>
#include <vector>

namespace deviascope {

/// A piece of a table: some columns of neighbouring rows. Missing values are NaN.
struct TableChunk {
    std::int64_t first_row = 0;               ///< of this piece in its file, counted from 0
    std::vector<std::vector<double>> column;  ///< in the order asked for; each n_rows long
    std::int64_t n_rows() const { return column.empty() ? 0 : std::ssize(column.front()); }
};

/// A catalogue file read in chunks, so that memory does not grow with the file.
/// Threads: main thread only.
class TableReader {
  public:
    virtual ~TableReader() = default;
    /// Fills `chunk` with the next rows; false at the end. Errors: InputError with path, row
    /// (as a person counts in that format: CSV line numbers, FITS rows from 1), column and
    /// value.
    virtual bool next(TableChunk& chunk) = 0;
    /// Rows in the file where known beforehand, for progress.
    virtual std::optional<std::int64_t> n_rows() const = 0;
    /// How a person names row `row` (counted from 0) of this file: `row 12` or `line 14`.
    virtual std::string place_of_row(std::int64_t row) const = 0;
    /// Unit of a column, as the file states it (FITS: TUNIT); empty where it states none.
    /// @param column  index in the order asked for
    virtual std::string unit_of(std::size_t column) const = 0;
};

/// Opens a catalogue for reading the named columns. The kind of file is told from its content.
///
/// FITS binary tables (the file begins with `SIMPLE  =`; gzip-compressed too): any numeric
/// column type, scaling and null values obeyed. HDF5: one dataset a column, all of a group and
/// as long as each other, of any integer or real type; missing is NaN. CSV (RFC 4180; gzip-
/// compressed too): a header line with names; quoted fields, doubled quotes and line breaks
/// inside quotes; lines end in LF or CRLF; a byte-order mark is skipped. A field that is blank
/// or `nan` is missing; blanks around a number and a leading plus sign are allowed; a number
/// that cannot be read is an error, as are a record with more or fewer fields than the header
/// and a double quote inside an unquoted field. Empty lines are allowed at the end only. Names
/// are matched exactly, else, if that is unambiguous, ignoring case.
/// @param table    HDU name or number (FITS; default: the first binary table), group (HDF5;
///                 default: the root group, or the only group of it where it holds no dataset);
///                 an error for CSV
/// @param columns  names in the order wanted; a name may be asked for once only
/// Errors: InputError (cannot open, no such table or column with the nearest name, vector or
/// text column, columns of unlike length, truncated or damaged file).
std::unique_ptr<TableReader> open_table(const std::filesystem::path& path,
                                        const std::optional<std::string>& table,
                                        const std::vector<std::string>& columns);

}  // namespace deviascope
