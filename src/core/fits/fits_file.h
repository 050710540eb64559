// SPDX-License-Identifier: GPL-2.0-or-later
// CORE (private): the only place that knows CFITSIO. Main thread only.
#pragma once

#include <cstdint>
#include <filesystem>
#include <memory>
#include <optional>
#include <span>
#include <string>
#include <vector>

namespace deviascope::fits {

/// Closes a file of the library; errors are dropped, for they were reported where they matter.
struct Closer {
    void operator()(void* file) const noexcept;
};
/// A `fitsfile*` of the library, kept out of this header.
using Handle = std::unique_ptr<void, Closer>;

/// What a binary-table column holds.
struct Column {
    std::string name;  ///< TTYPE
    int number = 0;    ///< 1-based, as CFITSIO counts
    /// Any integer, real or logical type; not text, complex, bits, variable-length arrays.
    bool is_numeric = false;
    std::int64_t repeat = 1;  ///< values a row; 0 for variable-length arrays
    std::string unit;         ///< TUNIT, may be empty
    std::string form;         ///< TFORM, for messages
};

/// `CFITSIO` and its version.
std::string library_version();

/// Numbers of the binary tables of a file (0 = primary HDU), ascending; maybe none.
/// Errors: InputError.
std::vector<int> binary_tables(const std::filesystem::path& path);

/// A FITS file open for reading, positioned at one binary table. File names are taken
/// literally (no extended syntax); gzip-compressed files are read too.
/// Errors of all members: InputError with path and the library's own words.
class Table {
  public:
    /// Opens `path` at the HDU named (EXTNAME, in any case) or numbered `hdu` (only digits;
    /// 0 = primary, as the standard counts); where empty, at the first binary table. A file
    /// that ends before the last row is refused here.
    explicit Table(const std::filesystem::path& path,
                   const std::optional<std::string>& hdu = {});

    const std::vector<Column>& columns() const { return columns_; }
    std::int64_t n_rows() const { return n_rows_; }
    /// Rows the library advises to read at a time.
    std::int64_t rows_at_a_time() const;

    /// Reads rows [first, first + values.size()/repeat) of a numeric column as doubles, scaling
    /// (TSCAL, TZERO, so unsigned integers too) and null values obeyed: nulls become NaN;
    /// infinities stay; logical T, F become 1, 0. Integers beyond 2^53 are rounded. Rows are
    /// counted from 0.
    void read(const Column& column, std::int64_t first, std::span<double> values) const;

    /// The same of an integer column, exactly. Errors: InputError: another type, a null value.
    void read(const Column& column, std::int64_t first, std::span<std::int64_t> values) const;

    /// Header cards of the table; empty where absent or without a value. An integer card may be
    /// written as a whole real number. Errors: InputError if of another type.
    std::optional<std::string> text_card(const std::string& keyword) const;
    std::optional<std::int64_t> integer_card(const std::string& keyword) const;

  private:
    void go_to_number(int hdu);
    void go_to_name(const std::string& name);
    void go_to_first_table();
    void list_columns();
    void refuse_if_cut_short() const;
    void check_rows(const Column& column, std::int64_t first, std::size_t n_values) const;
    std::optional<std::string> raw_card(const std::string& keyword) const;

    std::filesystem::path path_;
    Handle file_;
    std::vector<Column> columns_;
    std::vector<int> type_;  // the library's type code of each column
    std::int64_t n_rows_ = 0;
};

/// A FITS file with one binary table that is being written: to a temporary name (`.partial`
/// added), put in place by `close`. Left unclosed, the temporary file is removed. File names
/// are taken literally. Errors: OutputError.
class TableWriter {
  public:
    struct NewColumn {
        std::string name;
        std::string form;  ///< `D`, `E`, `J`, `K`, with a repeat count allowed
        std::string unit;
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
    void check(int status) const;

    std::filesystem::path path_, temporary_;
    Handle file_;
};

}  // namespace deviascope::fits
