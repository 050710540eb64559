// SPDX-License-Identifier: GPL-2.0-or-later
#include "core/fits/fits_file.h"

#include <fitsio.h>
#include <fmt/format.h>

#include <algorithm>
#include <array>
#include <charconv>
#include <cmath>
#include <cstdlib>
#include <limits>
#include <system_error>

#include "core/fits/library_call.h"
#include "deviascope/core/error.h"

namespace deviascope::fits {

namespace {

void check_read(int status,
                const std::filesystem::path& path,
                const std::string& place,
                const std::string& remedy = "check the file with a FITS verifier") {
    if (status == 0) return;
    throw InputError({path.string() + place, library_words(status), "", remedy});
}

/// Does the file open, list and read at all? Answered before the library, in plain words.
void refuse_unless_regular_file(const std::filesystem::path& path) {
    std::error_code failure;
    const auto status = std::filesystem::status(path, failure);
    if (!std::filesystem::exists(status))
        throw InputError({path.string(), "there is no such file", "", "check the path"});
    if (!std::filesystem::is_regular_file(status))
        throw InputError({path.string(), "this is not a regular file", "a FITS file", ""});
}

Handle open_for_reading(const std::filesystem::path& path) {
    refuse_unless_regular_file(path);
    int status = 0;
    fitsfile* file = nullptr;
    fits_open_diskfile(&file, literal_name(path).c_str(), READONLY, &status);
    Handle handle(file);
    check_read(status, path, "", "check that it is a FITS file that you may read");
    return handle;
}

int number_of_hdus(const Handle& file, const std::filesystem::path& path) {
    int status = 0;
    int n_hdus = 0;
    fits_get_num_hdus(raw(file), &n_hdus, &status);
    check_read(status, path, "");
    return n_hdus;
}

std::string extension_name(fitsfile* file) {
    int status = 0;
    std::array<char, FLEN_VALUE> name{};
    fits_read_key(file, TSTRING, "EXTNAME", name.data(), nullptr, &status);
    fits_clear_errmsg();
    return status == 0 ? name.data() : "";
}

bool is_binary_table(fitsfile* file) {
    int status = 0;
    int kind = 0;
    fits_get_hdu_type(file, &kind, &status);
    return status == 0 && kind == BINARY_TBL;
}

std::vector<int> table_numbers(const Handle& file, const std::filesystem::path& path) {
    const int n_hdus = number_of_hdus(file, path);
    std::vector<int> tables;
    for (int hdu = 1; hdu < n_hdus; ++hdu) {
        int status = 0;
        fits_movabs_hdu(raw(file), hdu + 1, nullptr, &status);
        check_read(status, path, fmt::format(": HDU {}", hdu));
        if (is_binary_table(raw(file))) tables.push_back(hdu);
    }
    return tables;
}

bool same_in_any_case(std::string_view a, std::string_view b) {
    const auto lower = [](char c) { return c >= 'A' && c <= 'Z' ? char(c - 'A' + 'a') : c; };
    return std::equal(a.begin(), a.end(), b.begin(), b.end(), [&](char p, char q) {
        return lower(p) == lower(q);
    });
}

std::optional<int> as_number(const std::string& text) {
    int number = 0;
    const char* end = text.data() + text.size();
    const auto result = std::from_chars(text.data(), end, number);
    const bool whole = result.ec == std::errc{} && result.ptr == end && text[0] != '-';
    return whole ? std::optional<int>(number) : std::nullopt;
}

bool is_integer_type(int type) {
    return type == TBYTE || type == TSBYTE || type == TSHORT || type == TUSHORT ||
           type == TINT || type == TUINT || type == TLONG || type == TULONG ||
           type == TINT32BIT || type == TLONGLONG || type == TULONGLONG;
}

bool is_real_type(int type) {
    return type == TFLOAT || type == TDOUBLE;
}

/// The value of a card without quotes, doubled quotes or trailing blanks.
std::string unquoted(const std::string& value) {
    std::string text;
    for (std::size_t at = 1; at + 1 < value.size(); ++at) {
        text += value[at];
        if (value[at] == '\'') ++at;
    }
    text.erase(text.find_last_not_of(' ') + 1);
    return text;
}

}  // namespace

std::vector<int> binary_tables(const std::filesystem::path& path) {
    return table_numbers(open_for_reading(path), path);
}

Table::Table(const std::filesystem::path& path, const std::optional<std::string>& hdu)
    : path_(path), file_(open_for_reading(path)) {
    if (!hdu) {
        go_to_first_table();
    } else if (const auto number = as_number(*hdu)) {
        go_to_number(*number);
    } else {
        go_to_name(*hdu);
    }
    if (!is_binary_table(raw(file_))) {
        throw InputError({fmt::format("{}: HDU {}", path_.string(), hdu.value_or("")),
                          "it is not a binary table",
                          "a binary-table extension",
                          "name another HDU"});
    }
    list_columns();
    refuse_if_cut_short();
}

void Table::go_to_number(int hdu) {
    int status = 0;
    const int n_hdus = number_of_hdus(file_, path_);
    if (hdu >= n_hdus) {
        throw InputError({path_.string(),
                          fmt::format("there is no HDU {}", hdu),
                          fmt::format("0 (the primary HDU) to {}", n_hdus - 1),
                          "name an HDU of the file"});
    }
    fits_movabs_hdu(raw(file_), hdu + 1, nullptr, &status);
    check_read(status, path_, fmt::format(": HDU {}", hdu));
}

void Table::go_to_name(const std::string& name) {
    int status = 0;
    const int n_hdus = number_of_hdus(file_, path_);
    std::string present;
    for (int hdu = 1; hdu <= n_hdus && status == 0; ++hdu) {
        fits_movabs_hdu(raw(file_), hdu, nullptr, &status);
        const std::string here = extension_name(raw(file_));
        if (same_in_any_case(here, name)) return;
        if (!here.empty()) present += (present.empty() ? "" : ", ") + here;
    }
    check_read(status, path_, "");
    throw InputError({path_.string(),
                      fmt::format("there is no HDU named {}", name),
                      present.empty() ? "its HDUs have no names" : "its HDUs are " + present,
                      "name an HDU of the file, or give its number (0 is the primary HDU)"});
}

void Table::go_to_first_table() {
    const std::vector<int> tables = table_numbers(file_, path_);
    if (tables.empty()) {
        throw InputError({path_.string(),
                          "it holds no binary table",
                          "a FITS file with a binary-table extension",
                          "check that this is the right file"});
    }
    go_to_number(tables.front());
}

void Table::list_columns() {
    int status = 0;
    int n_columns = 0;
    LONGLONG n_rows = 0;
    fits_get_num_cols(raw(file_), &n_columns, &status);
    fits_get_num_rowsll(raw(file_), &n_rows, &status);
    check_read(status, path_, "");
    n_rows_ = n_rows;
    for (int number = 1; number <= n_columns; ++number) {
        int type = 0;
        LONGLONG repeat = 0;
        fits_get_coltypell(raw(file_), number, &type, &repeat, nullptr, &status);
        check_read(status, path_, fmt::format(": column {}", number));
        const auto card = [&](const char* stem) {
            return text_card(stem + std::to_string(number)).value_or("");
        };
        Column column{card("TTYPE"), number, false, 0, card("TUNIT"), card("TFORM")};
        column.is_numeric = is_integer_type(type) || is_real_type(type) || type == TLOGICAL;
        column.repeat = type < 0 ? 0 : repeat;
        columns_.push_back(std::move(column));
        type_.push_back(type);
    }
}

void Table::refuse_if_cut_short() const {
    int status = 0;
    LONGLONG width = 0;
    fits_read_key(raw(file_), TLONGLONG, "NAXIS1", &width, nullptr, &status);
    unsigned char last = 0;
    if (status == 0 && n_rows_ > 0 && width > 0)
        fits_read_tblbytes(raw(file_), n_rows_, width, 1, &last, &status);
    if (status == 0) return;
    throw InputError({path_.string(),
                      fmt::format("the file ends before the last of its {} rows: {}",
                                  n_rows_,
                                  library_words(status)),
                      "",
                      "fetch or write the file again"});
}

std::int64_t Table::rows_at_a_time() const {
    int status = 0;
    long rows = 0;
    fits_get_rowsize(raw(file_), &rows, &status);
    check_read(status, path_, "");
    return std::max(1L, rows);
}

void Table::read(const Column& column, std::int64_t first, std::span<double> values) const {
    const std::string place = fmt::format(": column {}", column.name);
    if (!column.is_numeric) {
        throw InputError({path_.string() + place,
                          fmt::format("its form is {}", column.form),
                          "a numeric or logical column of fixed length",
                          "name another column"});
    }
    if (values.empty()) return;
    check_rows(column, first, values.size());
    int status = 0;
    int any_null = 0;  // the library writes to it whenever it meets a null
    const int type = type_.at(std::size_t(column.number - 1));
    const auto n = LONGLONG(values.size());
    if (type == TLOGICAL) {
        constexpr char null = 2;
        std::vector<char> truth(values.size());
        char null_value = null;
        fits_read_col(raw(file_),
                      TLOGICAL,
                      column.number,
                      first + 1,
                      1,
                      n,
                      &null_value,
                      truth.data(),
                      &any_null,
                      &status);
        std::transform(truth.begin(), truth.end(), values.begin(), [](char t) {
            return t == null ? std::numeric_limits<double>::quiet_NaN() : double(t);
        });
    } else {
        // With a null value the library also turns infinities into it, so reals go without:
        // their NaN is null already.
        double null_value = std::numeric_limits<double>::quiet_NaN();
        double* null = is_real_type(type) ? nullptr : &null_value;
        fits_read_col(raw(file_),
                      TDOUBLE,
                      column.number,
                      first + 1,
                      1,
                      n,
                      null,
                      values.data(),
                      &any_null,
                      &status);
    }
    check_read(status, path_, place);
}

void Table::check_rows(const Column& column, std::int64_t first, std::size_t n_values) const {
    ensure(column.repeat > 0 && first >= 0 &&
               first + std::int64_t(n_values) / column.repeat <= n_rows_,
           "rows asked of a FITS table lie inside it");
}

void Table::read(const Column& column,
                 std::int64_t first,
                 std::span<std::int64_t> values) const {
    const std::string place = fmt::format("{}: column {}", path_.string(), column.name);
    if (!column.is_numeric || !is_integer_type(type_.at(std::size_t(column.number - 1))))
        throw InputError({place,
                          fmt::format("its form is {}", column.form),
                          "an integer column of fixed length",
                          "check that this is the right file"});
    if (values.empty()) return;
    check_rows(column, first, values.size());
    int status = 0;
    int any_null = 0;
    LONGLONG null_value = std::numeric_limits<LONGLONG>::min();  // where the column knows nulls
    fits_read_col(raw(file_),
                  TLONGLONG,
                  column.number,
                  first + 1,
                  1,
                  LONGLONG(values.size()),
                  &null_value,
                  values.data(),
                  &any_null,
                  &status);
    check_read(status, path_, fmt::format(": column {}", column.name));
    if (any_null == 0) return;
    throw InputError(
        {place, "a value is missing", "an integer in each row", "correct the file"});
}

/// The value as written in the header; empty where there is no card or no value.
std::optional<std::string> Table::raw_card(const std::string& keyword) const {
    int status = 0;
    std::array<char, FLEN_VALUE> value{};
    fits_read_keyword(raw(file_), keyword.c_str(), value.data(), nullptr, &status);
    if (status == KEY_NO_EXIST) {
        fits_clear_errmsg();
        return {};
    }
    check_read(status, path_, ": " + keyword);
    if (value[0] == '\0') return {};
    return std::string(value.data());
}

std::optional<std::string> Table::text_card(const std::string& keyword) const {
    const auto value = raw_card(keyword);
    if (!value) return {};
    if (value->front() != '\'')
        throw InputError({path_.string() + ": " + keyword,
                          fmt::format("its value is {}", *value),
                          "text in quotes",
                          "correct the header"});
    return unquoted(*value);
}

std::optional<std::int64_t> Table::integer_card(const std::string& keyword) const {
    const auto value = raw_card(keyword);
    if (!value) return {};
    char* end = nullptr;
    const double number = std::strtod(value->c_str(), &end);
    const bool whole =
        *end == '\0' && std::abs(number) < 0x1p53 && std::floor(number) == number;
    if (!whole)
        throw InputError({path_.string() + ": " + keyword,
                          fmt::format("its value is {}", *value),
                          "a whole number",
                          "correct the header"});
    return std::int64_t(number);
}

}  // namespace deviascope::fits
