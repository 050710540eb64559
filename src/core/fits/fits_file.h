// SPDX-License-Identifier: GPL-2.0-or-later
// CORE (private): the only place that knows CFITSIO. Main thread only.
#pragma once

#include <cstdint>
#include <filesystem>
#include <limits>
#include <optional>
#include <span>
#include <string>
#include <vector>

namespace deviascope::fits {

/// What a binary-table column holds.
struct Column {
    std::string name;         ///< TTYPE
    int number = 0;           ///< 1-based, as CFITSIO counts
    bool is_numeric = false;  ///< any integer, real or logical type; not text, complex, bits
    std::int64_t repeat = 1;  ///< values a row; 0 for variable-length arrays
    std::string unit;         ///< TUNIT, may be empty
    std::string form;         ///< TFORM, for messages
};

/// A FITS file open for reading, positioned at one binary table.
/// Errors of all members: InputError with path and the library's own words.
class Table {
  public:
    /// Opens `path` at the HDU named or numbered `hdu` (0 = primary, as the standard counts);
    /// where empty, at the first binary table.
    explicit Table(const std::filesystem::path& path,
                   const std::optional<std::string>& hdu = {});
    ~Table();
    Table(const Table&) = delete;
    Table& operator=(const Table&) = delete;

    const std::vector<Column>& columns() const { return columns_; }
    std::int64_t n_rows() const { return n_rows_; }
    /// Rows the library advises to read at a time.
    std::int64_t rows_at_a_time() const;

    /// Reads rows [first, first + values.size()/repeat) of a numeric column as doubles, scaling
    /// and null values obeyed: nulls become NaN. Rows are counted from 0.
    void read(const Column& column, std::int64_t first, std::span<double> values) const;

    /// Header cards of the table; empty where absent. Errors: InputError if of another type.
    std::optional<std::string> text_card(const std::string& keyword) const;
    std::optional<std::int64_t> integer_card(const std::string& keyword) const;

  private:
    std::filesystem::path path_;
    void* file_ = nullptr;  // fitsfile*, kept out of the header
    std::vector<Column> columns_;
    std::int64_t n_rows_ = 0;
};

/// A FITS file with one binary table that is being written: to a temporary name, put in place
/// by `close`. Left unclosed, the temporary file is removed. Errors: OutputError.
class TableWriter {
  public:
    struct NewColumn {
        std::string name, form,
            unit;  ///< form: `D`, `E`, `J`, `K`, with a repeat count allowed
    };
    TableWriter(const std::filesystem::path& path,
                const std::string& extension_name,
                const std::vector<NewColumn>& columns);
    ~TableWriter();
    TableWriter(const TableWriter&) = delete;
    TableWriter& operator=(const TableWriter&) = delete;

    /// Adds a header card.
    void card(const std::string& keyword, const std::string& value, const std::string& comment);
    void card(const std::string& keyword, std::int64_t value, const std::string& comment);
    void card(const std::string& keyword, double value, const std::string& comment);
    /// Writes values of column `column` (0-based) from row `first` (0-based) on; NaN stays NaN
    /// in real columns.
    void write(std::size_t column, std::int64_t first, std::span<const double> values);
    void write(std::size_t column, std::int64_t first, std::span<const std::int64_t> values);
    void close();

  private:
    std::filesystem::path path_, temporary_;
    void* file_ = nullptr;
};

}  // namespace deviascope::fits
