// SPDX-License-Identifier: GPL-2.0-or-later
// CATALOGUE (private): text to records and fields
#pragma once

#include <cstdint>
#include <filesystem>
#include <string>
#include <string_view>
#include <vector>

#include "core/gzip/byte_source.h"

namespace deviascope {

/// The records of a CSV file, plain or gzip-compressed, one after the other, read in large
/// blocks.
/// Source: RFC 4180 (Shafranovich 2005). Beyond it: LF alone ends a line too, and a UTF-8
/// byte-order mark at the start is skipped.
class CsvRecords {
  public:
    /// Errors: InputError: cannot be read.
    explicit CsvRecords(const std::filesystem::path& path);

    /// Splits the next record; false at the end of the file. A field is a view of the text
    /// without its outer quotes, quotes inside it still doubled; it holds until the next call.
    /// Errors: InputError: a quote where none may stand, a quoted field that is never closed.
    bool next(std::vector<std::string_view>& fields);

    /// Line on which the last record began, counted from 1.
    std::int64_t line() const { return line_; }
    /// True once a record with a line break inside quotes was met.
    bool has_long_records() const { return has_long_records_; }

  private:
    enum class Found { record, need_more };

    Found split(std::vector<std::string_view>& fields);
    void split_unquoted(const char* end, std::vector<std::string_view>& fields);
    Found split_quoted(std::vector<std::string_view>& fields);
    const char* quoted_field_end(const char* p) const;
    const char* unquoted_field_end(const char* p) const;
    bool read_more();
    std::int64_t line_of(const char* p) const;
    [[noreturn]] void refuse_quote(const char* p) const;

    std::filesystem::path path_;
    ByteSource file_;
    std::vector<char> buffer_;
    const char* begin_ = nullptr;  // of what is not yet split
    const char* end_ = nullptr;    // of what was read
    bool at_end_of_file_ = false;
    bool has_long_records_ = false;
    std::int64_t line_ = 0;
    std::int64_t next_line_ = 1;
};

/// The text of a field: doubled quotes made single.
std::string text_of_field(std::string_view field);

}  // namespace deviascope
