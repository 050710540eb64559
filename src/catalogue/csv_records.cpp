// SPDX-License-Identifier: GPL-2.0-or-later
#include "catalogue/csv_records.h"

#include <fmt/format.h>

#include <algorithm>
#include <cstring>
#include <span>

#include "deviascope/core/error.h"

namespace deviascope {

namespace {

constexpr std::size_t block_size = std::size_t{1} << 20U;
constexpr std::ptrdiff_t longest_record = std::ptrdiff_t{1} << 26U;  // beyond: a quote is open
constexpr std::string_view byte_order_mark = "\xEF\xBB\xBF";

const char* find(const char* begin, const char* end, char c) {
    const void* found = std::memchr(begin, c, static_cast<std::size_t>(end - begin));
    return static_cast<const char*>(found);
}

std::string_view view(const char* begin, const char* end) {
    return {begin, static_cast<std::size_t>(end - begin)};
}

/// The line that ends before `end`, without the carriage return of CRLF.
const char* without_carriage_return(const char* begin, const char* end) {
    return end != begin && end[-1] == '\r' ? end - 1 : end;
}

}  // namespace

CsvRecords::CsvRecords(const std::filesystem::path& path)
    : path_(path), file_(path), buffer_(block_size) {
    begin_ = end_ = buffer_.data();
    read_more();
    if (view(begin_, end_).starts_with(byte_order_mark)) begin_ += byte_order_mark.size();
}

bool CsvRecords::next(std::vector<std::string_view>& fields) {
    line_ = next_line_;
    fields.clear();
    while (begin_ == end_ || split(fields) == Found::need_more) {
        fields.clear();
        if (end_ - begin_ <= longest_record && read_more()) continue;
        if (begin_ == end_) return false;
        throw InputError({fmt::format("{}: line {}", path_.string(), line_),
                          "the record that begins here holds a quoted field without an end",
                          "a field that begins with a double quote ends with one",
                          "close the quote, or double a quote that is part of the text"});
    }
    return true;
}

/// Splits the record that begins at begin_ and moves begin_ behind it.
CsvRecords::Found CsvRecords::split(std::vector<std::string_view>& fields) {
    const char* newline = find(begin_, end_, '\n');
    if (newline == nullptr) return Found::need_more;
    if (find(begin_, newline, '"') != nullptr) return split_quoted(fields);
    split_unquoted(newline, fields);
    begin_ = newline + 1;
    ++next_line_;
    return Found::record;
}

/// The common case, fast: a line without any quote.
void CsvRecords::split_unquoted(const char* end, std::vector<std::string_view>& fields) {
    const char* line_end = without_carriage_return(begin_, end);
    const char* field = begin_;
    while (const char* comma = find(field, line_end, ',')) {
        fields.push_back(view(field, comma));
        field = comma + 1;
    }
    fields.push_back(view(field, line_end));
}

CsvRecords::Found CsvRecords::split_quoted(std::vector<std::string_view>& fields) {
    for (const char* field = begin_; field < end_;) {
        const bool quoted = *field == '"';
        const char* stop = quoted ? quoted_field_end(field + 1) : unquoted_field_end(field);
        if (stop == nullptr) return Found::need_more;
        const char* after = stop + (quoted ? 1 : 0);
        if (quoted && after < end_ && *after == '\r') ++after;
        if (after == end_) return Found::need_more;
        if (*after != ',' && *after != '\n') refuse_quote(stop);
        if (quoted && after[-1] == '\r' && *after == ',') refuse_quote(stop);
        const char* text_end =
            quoted || *after == ',' ? stop : without_carriage_return(field, stop);
        fields.push_back(view(quoted ? field + 1 : field, text_end));
        field = after + 1;
        if (*after == ',') continue;
        const std::int64_t lines = std::count(begin_, field, '\n');
        has_long_records_ = has_long_records_ || lines > 1;
        next_line_ += lines;
        begin_ = field;
        return Found::record;
    }
    return Found::need_more;
}

/// The closing quote of a field whose text begins at `p`; null where it is not yet read.
const char* CsvRecords::quoted_field_end(const char* p) const {
    while ((p = find(p, end_, '"')) != nullptr) {
        if (p + 1 == end_) return nullptr;  // a second quote may follow in the next block
        if (p[1] != '"') return p;
        p += 2;
    }
    return nullptr;
}

/// The comma or line feed that ends an unquoted field; null where it is not yet read.
const char* CsvRecords::unquoted_field_end(const char* p) const {
    for (; p < end_; ++p) {
        if (*p == ',' || *p == '\n') return p;
        if (*p == '"') refuse_quote(p);
    }
    return nullptr;
}

void CsvRecords::refuse_quote(const char* p) const {
    throw InputError({fmt::format("{}: line {}", path_.string(), line_of(p)),
                      "a double quote stands inside a field or text follows a quoted field",
                      "quotes stand around a whole field, and are doubled inside it (RFC 4180)",
                      "quote the whole field and double the quotes that belong to its text"});
}

std::int64_t CsvRecords::line_of(const char* p) const {
    return line_ + std::count(begin_, p, '\n');
}

/// Moves what is not yet split to the front and reads a block behind it; false at the end. The
/// last line gets the line end it may lack.
bool CsvRecords::read_more() {
    if (at_end_of_file_) return false;
    const auto kept = static_cast<std::size_t>(end_ - begin_);
    std::memmove(buffer_.data(), begin_, kept);
    if (buffer_.size() < kept + block_size + 1)
        buffer_.resize(std::max(2 * buffer_.size(), kept + block_size + 1));
    const std::size_t wanted = buffer_.size() - kept - 1;
    const std::size_t got = file_.read(std::span(buffer_).subspan(kept, wanted));
    std::size_t size = kept + got;
    at_end_of_file_ = got < wanted;
    if (at_end_of_file_ && size > 0 && buffer_[size - 1] != '\n') buffer_[size++] = '\n';
    begin_ = buffer_.data();
    end_ = begin_ + size;
    return size > kept;
}

std::string text_of_field(std::string_view field) {
    std::string text;
    for (std::size_t i = 0; i < field.size(); ++i) {
        text += field[i];
        if (field[i] == '"') ++i;  // the second of a pair
    }
    return text;
}

}  // namespace deviascope
