// SPDX-License-Identifier: GPL-2.0-or-later
#include <fmt/format.h>

#include <algorithm>
#include <bit>
#include <string>

#include "core/fits/fits_file.h"
#include "deviascope/core/error.h"
#include "deviascope/sky/moc.h"
#include "sky/map_card.h"

namespace deviascope {

namespace {

using Path = std::filesystem::path;
using Range = Moc::Range;

constexpr std::int64_t n_deepest = std::int64_t{12} << 2 * Moc::deepest_order;

bool is_moc_table(const fits::Table& table) {
    const std::string ordering = word_card(table, "ORDERING");
    return ordering == "NUNIQ" || ordering == "RANGE";
}

/// Number of the table that holds the MOC; -1: none.
int moc_table_of(const Path& path) {
    for (const int hdu : fits::binary_tables(path))
        if (is_moc_table(fits::Table(path, std::to_string(hdu)))) return hdu;
    return -1;
}

InputError value_error(const Path& path,
                       std::size_t at,
                       const std::string& found,
                       const std::string& allowed) {
    return InputError({fmt::format("{}: value {} of the MOC", path.string(), at + 1),
                       found,
                       allowed,
                       "fetch or write the file again"});
}

/// All numbers of the one column of a MOC.
std::vector<std::int64_t> numbers_of(const fits::Table& table, const Path& path) {
    if (table.columns().size() != 1 || table.columns()[0].repeat < 1)
        throw InputError({path.string(),
                          fmt::format("the MOC's table has {} columns", table.columns().size()),
                          "one column of 32- or 64-bit integers",
                          "check that this is the right file"});
    const fits::Column& column = table.columns()[0];
    std::vector<std::int64_t> numbers(static_cast<std::size_t>(table.n_rows() * column.repeat));
    table.read(column, 0, numbers);
    return numbers;
}

/// MOC 2.0: uniq = 4 x 4^order + index, so that the order is half the place of the highest bit.
Range range_of_uniq(std::int64_t uniq, std::size_t at, const Path& path) {
    const int order =
        uniq < 4 ? -1 : (static_cast<int>(std::bit_width(std::uint64_t(uniq))) - 1) / 2 - 1;
    const std::int64_t index = order < 0 ? 0 : uniq - (std::int64_t{4} << 2 * order);
    if (order < 0 || order > Moc::deepest_order || index >= std::int64_t{12} << 2 * order)
        throw value_error(path,
                          at,
                          fmt::format("the number is {}", uniq),
                          "4 x 4^order + pixel, with an order up to 29");
    const int shift = 2 * (Moc::deepest_order - order);
    return {index << shift, (index + 1) << shift};
}

std::vector<Range> ranges_of_uniq(const std::vector<std::int64_t>& numbers, const Path& path) {
    std::vector<Range> ranges;
    for (std::size_t at = 0; at < numbers.size(); ++at)
        ranges.push_back(range_of_uniq(numbers[at], at, path));
    return ranges;
}

std::vector<Range> ranges_of_pairs(const std::vector<std::int64_t>& numbers, const Path& path) {
    if (numbers.size() % 2 != 0)
        throw InputError({path.string(),
                          fmt::format("the MOC holds {} numbers", numbers.size()),
                          "starts and ends in turn, an even number",
                          "fetch or write the file again"});
    std::vector<Range> ranges;
    for (std::size_t at = 0; at < numbers.size(); at += 2) {
        const Range range{numbers[at], numbers[at + 1]};
        if (range.begin < 0 || range.begin >= range.end || range.end > n_deepest)
            throw value_error(path,
                              at,
                              fmt::format("the range is {} … {}", range.begin, range.end),
                              fmt::format("0 <= start < end <= {}", n_deepest));
        ranges.push_back(range);
    }
    return ranges;
}

void refuse_other_dimensions(const fits::Table& table, const Path& path) {
    const std::string dimension = word_card(table, "MOCDIM");
    if (!dimension.empty() && dimension != "SPACE")
        throw card_error(path, "MOCDIM", dimension, "SPACE", "give a MOC of a region of sky");
}

/// The pixels that make up a range, the largest that fit, as NUNIQ numbers.
void add_uniq(Range range, std::vector<std::int64_t>& numbers) {
    while (range.begin < range.end) {
        int shift = 2 * Moc::deepest_order;
        if (range.begin != 0)
            shift = std::min(shift, std::countr_zero(std::uint64_t(range.begin)) / 2 * 2);
        while ((std::int64_t{1} << shift) > range.end - range.begin) shift -= 2;
        const int order = Moc::deepest_order - shift / 2;
        numbers.push_back((std::int64_t{4} << 2 * order) + (range.begin >> shift));
        range.begin += std::int64_t{1} << shift;
    }
}

void write_cards(fits::TableWriter& writer, int order) {
    using Text = std::string;
    writer.card("MOCVERS", Text("2.0"), "version of the MOC standard");
    writer.card("MOCDIM", Text("SPACE"), "a region of sky");
    writer.card("ORDERING", Text("NUNIQ"), "4 x 4^order + pixel (NESTED)");
    writer.card("COORDSYS", Text("C"), "ICRS");
    writer.card("MOCORD_S", std::int64_t{order}, "deepest order");
    writer.card("MOCORDER", std::int64_t{order}, "the same, for readers of version 1.1");
}

}  // namespace

bool is_moc(const Path& path) {
    return moc_table_of(path) >= 0;
}

MocFile read_moc(const Path& path) {
    const int hdu = moc_table_of(path);
    if (hdu < 0)
        throw InputError({path.string(),
                          "no binary table in it is a MOC",
                          "a table with the card ORDERING = 'NUNIQ' or 'RANGE'",
                          "check that this is the right file"});
    const fits::Table table(path, std::to_string(hdu));
    refuse_other_dimensions(table, path);
    const std::vector<std::int64_t> numbers = numbers_of(table, path);
    const bool by_number = word_card(table, "ORDERING") == "NUNIQ";
    return {Moc(by_number ? ranges_of_uniq(numbers, path) : ranges_of_pairs(numbers, path)),
            frame_card(table, path)};
}

void write_moc(const Path& path, const Moc& region) {
    std::vector<std::int64_t> numbers;
    for (const Range& range : region.ranges()) add_uniq(range, numbers);
    std::ranges::sort(numbers);
    fits::TableWriter writer(path, "MOC", {{"UNIQ", "1K", ""}});
    write_cards(writer, region.order());
    writer.write(0, 0, numbers);
    writer.close();
}

}  // namespace deviascope
