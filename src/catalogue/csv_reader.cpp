// SPDX-License-Identifier: GPL-2.0-or-later
#include "catalogue/csv_reader.h"

#include <fmt/format.h>

#include <charconv>
#include <limits>
#include <utility>

#include "catalogue/column_match.h"
#include "catalogue/reading.h"
#include "deviascope/core/error.h"

namespace deviascope {

namespace {

bool is_blank(char c) {
    return c == ' ' || c == '\t';
}

std::string_view trimmed(std::string_view text) {
    while (!text.empty() && is_blank(text.front())) text.remove_prefix(1);
    while (!text.empty() && is_blank(text.back())) text.remove_suffix(1);
    return text;
}

/// std::from_chars knows no plus sign.
std::string_view without_plus(std::string_view text) {
    const bool plus = text.size() > 1 && text[0] == '+' && text[1] != '-' && text[1] != '+';
    return plus ? text.substr(1) : text;
}

/// What a message shows of a field.
std::string shown(std::string_view field) {
    constexpr std::size_t longest = 60;
    if (field.size() <= longest) return std::string(field);
    return std::string(field.substr(0, longest)) + "…";
}

}  // namespace

CsvReader::CsvReader(const std::filesystem::path& path, const std::vector<std::string>& columns)
    : path_(path), records_(path) {
    if (!records_.next(fields_)) {
        throw InputError({path.string(),
                          "the file is empty",
                          "a CSV file begins with a line of column names",
                          ""});
    }
    for (const std::string_view field : fields_)
        names_.push_back(text_of_field(trimmed(field)));
    refuse_other_separators(columns.size());
    for (const std::string& column : columns)
        wanted_.push_back(match_column(path, column, names_));
}

/// A file whose only column holds another separator, where several columns are asked for.
void CsvReader::refuse_other_separators(std::size_t n_wanted) const {
    if (names_.size() > 1 || n_wanted < 2) return;
    for (const auto& [separator, name] :
         {std::pair(';', "semicolons"), std::pair('\t', "tabs")}) {
        if (names_[0].find(separator) == std::string::npos) continue;
        throw InputError({path_.string() + ": line 1",
                          fmt::format("the names are separated by {}", name),
                          "commas separate the fields",
                          "write the file with commas and decimal points"});
    }
}

bool CsvReader::next(TableChunk& chunk) {
    chunk.first_row = n_read_;
    chunk.column.resize(wanted_.size());
    for (auto& column : chunk.column) column.resize(rows_per_chunk);
    std::size_t row = 0;
    for (; row < static_cast<std::size_t>(rows_per_chunk) && read_record(); ++row)
        for (std::size_t i = 0; i < wanted_.size(); ++i)
            chunk.column[i][row] = number(wanted_[i]);
    for (auto& column : chunk.column) column.resize(row);
    n_read_ += static_cast<std::int64_t>(row);
    return row > 0;
}

/// Splits the next row into fields_; false at the end. Empty lines may only end the file.
bool CsvReader::read_record() {
    while (records_.next(fields_)) {
        const bool empty = fields_.size() == 1 && fields_[0].empty() && names_.size() > 1;
        if (empty && empty_line_ == 0) empty_line_ = records_.line();
        if (empty) continue;
        if (empty_line_ != 0 || fields_.size() != names_.size()) refuse_ragged();
        return true;
    }
    return false;
}

double CsvReader::number(std::size_t field) const {
    const std::string_view text = without_plus(trimmed(fields_[field]));
    if (text.empty()) return std::numeric_limits<double>::quiet_NaN();
    double value = 0.0;
    const char* end = text.data() + text.size();
    const auto [stop, error] = std::from_chars(text.data(), end, value);
    if (error == std::errc::result_out_of_range && stop == end)
        refuse_number(field, "is too large or too small for a double-precision number");
    if (error != std::errc() || stop != end) refuse_number(field, "is not a number");
    return value;
}

void CsvReader::refuse_number(std::size_t field, const char* what) const {
    throw InputError(
        {fmt::format("{}: line {}: column {}", path_.string(), records_.line(), names_[field]),
         fmt::format("`{}` {}", shown(text_of_field(fields_[field])), what),
         "a decimal number with a point, or blank or nan where it is missing",
         "correct the value"});
}

void CsvReader::refuse_ragged() const {
    const std::int64_t line = empty_line_ != 0 ? empty_line_ : records_.line();
    throw InputError(
        {fmt::format("{}: line {}", path_.string(), line),
         empty_line_ != 0 ? "the line is empty, and rows follow"
                          : fmt::format("the record has {} fields", fields_.size()),
         fmt::format("each record has {} fields, as many as the header", names_.size()),
         "correct the line; a field that holds a comma is put in double quotes"});
}

std::string CsvReader::place_of_row(std::int64_t row) const {
    if (!records_.has_long_records()) return fmt::format("line {}", row + 2);
    // Rare: records with line breaks inside. Counting anew keeps no line number a row in
    // memory.
    CsvRecords again(path_);
    std::vector<std::string_view> fields;
    for (std::int64_t i = 0; i < row + 2; ++i) again.next(fields);
    return fmt::format("line {}", again.line());
}

}  // namespace deviascope
