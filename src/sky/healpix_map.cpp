// SPDX-License-Identifier: GPL-2.0-or-later
#include "deviascope/sky/healpix_map.h"

#include <fmt/format.h>

#include <algorithm>
#include <cmath>
#include <limits>
#include <utility>

#include "core/fits/fits_file.h"
#include "deviascope/core/error.h"
#include "deviascope/sky/pixelisation.h"
#include "sky/map_card.h"

namespace deviascope {

namespace {

constexpr double unseen = -1.6375e30;  // HEALPix's mark of a pixel without a value
constexpr double nan_value = std::numeric_limits<double>::quiet_NaN();

using Path = std::filesystem::path;

// ---- the header of a map ----

std::string upper(std::string text) {
    for (char& c : text)
        if (c >= 'a' && c <= 'z') c = char(c - 'a' + 'A');
    return text;
}

/// What the header says about a map.
struct Layout {
    int nside = 1;
    bool nested = false;
    bool is_explicit = false;  ///< pixel numbers stand beside the values
    std::optional<Frame> frame;
};

bool is_healpix(const fits::Table& table) {
    return word_card(table, "PIXTYPE") == "HEALPIX" || table.integer_card("NSIDE").has_value();
}

const fits::Column* column_named_pixel(const fits::Table& table) {
    for (const fits::Column& column : table.columns())
        if (upper(column.name) == "PIXEL") return &column;
    return nullptr;
}

bool read_is_explicit(const fits::Table& table, const Path& path) {
    const std::string scheme = word_card(table, "INDXSCHM");
    if (scheme.empty()) return column_named_pixel(table) != nullptr;
    if (scheme != "IMPLICIT" && scheme != "EXPLICIT")
        throw card_error(path, "INDXSCHM", scheme, "IMPLICIT or EXPLICIT");
    return scheme == "EXPLICIT";
}

Layout read_layout(const fits::Table& table, const Path& path) {
    const auto nside = table.integer_card("NSIDE");
    if (!nside || !Pixelisation::is_valid_nside(*nside))
        throw card_error(path,
                         "NSIDE",
                         nside ? std::to_string(*nside) : "",
                         fmt::format("a power of two, 1 to {}", Pixelisation::max_nside));
    const std::string ordering = word_card(table, "ORDERING");
    if (ordering != "RING" && ordering != "NESTED" && ordering != "NEST")
        throw card_error(path, "ORDERING", ordering, "RING or NESTED");
    Layout layout;
    layout.nside = int(*nside);
    layout.nested = ordering != "RING";
    layout.is_explicit = read_is_explicit(table, path);
    layout.frame = frame_card(table, path);
    return layout;
}

// ---- the values of a map ----

/// One map being read.
struct Source {
    const Path& path;
    const fits::Table& table;
    Layout layout;
    Pixelisation grid;

    std::int64_t ring(std::int64_t as_written) const {
        return layout.nested ? grid.ring_of_nested(as_written) : as_written;
    }
};

const fits::Column& value_column(const Source& source, const fits::Column* pixel_column) {
    for (const fits::Column& column : source.table.columns())
        if (column.is_numeric && column.repeat > 0 && &column != pixel_column) return column;
    throw InputError({source.path.string(),
                      "the map has no column of numbers",
                      "a numeric column of fixed length",
                      "check that this is the right file"});
}

/// Reads a column some rows at a time; `take(index of the first value, values)` gets them.
template <class Take>
void for_each_block(const fits::Table& table, const fits::Column& column, const Take& take) {
    const std::int64_t block = table.rows_at_a_time();
    std::vector<double> values;
    for (std::int64_t row = 0; row < table.n_rows(); row += block) {
        const std::int64_t rows = std::min(block, table.n_rows() - row);
        values.resize(static_cast<std::size_t>(rows * column.repeat));
        table.read(column, row, values);
        take(row * column.repeat, std::as_const(values));
    }
}

/// NaN for the mark, which may have passed through single precision on its way.
double without_mark(double value) {
    return std::abs(value - unseen) <= 1e-5 * -unseen ? nan_value : value;
}

std::int64_t checked_pixel(const Source& source, double number, std::int64_t row) {
    const auto n_pixels = source.grid.n_pixels();
    if (number >= 0 && number < double(n_pixels) && number == std::floor(number))
        return std::int64_t(number);
    throw InputError({fmt::format("{}: column PIXEL, row {}", source.path.string(), row + 1),
                      fmt::format("the pixel number is {}", number),
                      fmt::format("0 to {} for NSIDE {}", n_pixels - 1, source.layout.nside),
                      "correct the map"});
}

/// Pixel numbers of an explicit map as RING numbers, in the order of the file.
std::vector<std::int64_t> read_pixels(const Source& source, const fits::Column& column) {
    std::vector<std::int64_t> pixels;
    for_each_block(source.table, column, [&](std::int64_t, const std::vector<double>& numbers) {
        for (const double number : numbers) {
            const std::int64_t row = std::int64_t(pixels.size()) / column.repeat;
            pixels.push_back(source.ring(checked_pixel(source, number, row)));
        }
    });
    return pixels;
}

void refuse_repeated(const Source& source, std::vector<std::int64_t> pixels) {
    std::sort(pixels.begin(), pixels.end());
    const auto twice = std::adjacent_find(pixels.begin(), pixels.end());
    if (twice == pixels.end()) return;
    const auto as_written = source.layout.nested ? source.grid.nested_of_ring(*twice) : *twice;
    throw InputError({source.path.string() + ": column PIXEL",
                      fmt::format("pixel {} is there more than once", as_written),
                      "each pixel once",
                      "correct the map"});
}

void read_explicit(const Source& source, std::vector<double>& value) {
    const fits::Column* pixel_column = column_named_pixel(source.table);
    if (pixel_column == nullptr || !pixel_column->is_numeric)
        throw InputError({source.path.string(),
                          "INDXSCHM is EXPLICIT but there is no numeric column PIXEL",
                          "a column PIXEL with the pixel numbers",
                          "correct the map"});
    const fits::Column& column = value_column(source, pixel_column);
    if (column.repeat != pixel_column->repeat)
        throw InputError({fmt::format("{}: column {}", source.path.string(), column.name),
                          fmt::format("it holds {} values a row", column.repeat),
                          fmt::format("{}, as column PIXEL", pixel_column->repeat),
                          "correct the map"});
    const std::vector<std::int64_t> pixels = read_pixels(source, *pixel_column);
    refuse_repeated(source, pixels);
    auto pixel = pixels.begin();
    for_each_block(source.table, column, [&](std::int64_t, const std::vector<double>& values) {
        for (const double one : values)
            value[static_cast<std::size_t>(*pixel++)] = without_mark(one);
    });
}

void read_implicit(const Source& source, std::vector<double>& value) {
    const fits::Column& column = value_column(source, nullptr);
    const std::int64_t n_rows = source.table.n_rows();
    if (n_rows * column.repeat != source.grid.n_pixels())
        throw InputError({fmt::format("{}: column {}", source.path.string(), column.name),
                          fmt::format("{} rows of {} values", n_rows, column.repeat),
                          fmt::format("{} values in all, 12 NSIDE^2", source.grid.n_pixels()),
                          "write the whole sky, or pixel numbers beside the values"});
    for_each_block(
        source.table, column, [&](std::int64_t pixel, const std::vector<double>& values) {
            for (const double one : values)
                value[static_cast<std::size_t>(source.ring(pixel++))] = without_mark(one);
        });
}

HealpixMap read_map(const fits::Table& table, const Path& path) {
    const Layout layout = read_layout(table, path);
    const Source source{path, table, layout, Pixelisation(layout.nside)};
    HealpixMap map{layout.nside, layout.frame, {}};
    map.value.assign(static_cast<std::size_t>(source.grid.n_pixels()), nan_value);
    (layout.is_explicit ? read_explicit : read_implicit)(source, map.value);
    return map;
}

// ---- writing ----

std::string card_of(Frame frame) {
    switch (frame) {
        case Frame::galactic:
            return "G";
        case Frame::ecliptic:
            return "E";
        case Frame::icrs:
            break;
    }
    return "C";
}

void write_cards(fits::TableWriter& writer, const HealpixMap& map, std::int64_t n_pixels) {
    using Text = std::string;
    using Whole = std::int64_t;
    writer.card("PIXTYPE", Text("HEALPIX"), "HEALPix pixelisation");
    writer.card("ORDERING", Text("RING"), "pixel ordering scheme");
    writer.card("NSIDE", Whole(map.nside), "resolution parameter");
    writer.card("FIRSTPIX", Whole(0), "first pixel number (0 based)");
    writer.card("LASTPIX", Whole(n_pixels - 1), "last pixel number (0 based)");
    writer.card("INDXSCHM", Text("IMPLICIT"), "pixel numbers follow from the order");
    writer.card("OBJECT", Text("FULLSKY"), "sky coverage");
    writer.card("BAD_DATA", unseen, "value of pixels without data");
    if (map.frame) writer.card("COORDSYS", card_of(*map.frame), name_of(*map.frame));
}

}  // namespace

HealpixMap read_healpix_map(const Path& path) {
    for (const int hdu : fits::binary_tables(path)) {
        const fits::Table table(path, std::to_string(hdu));
        if (is_healpix(table)) return read_map(table, path);
    }
    throw InputError({path.string(),
                      "no binary table in it is a HEALPix map",
                      "a table with the card PIXTYPE = 'HEALPIX'",
                      "check that this is the right file"});
}

void write_healpix_map(const Path& path,
                       const HealpixMap& map,
                       const std::string& column,
                       const std::string& unit) {
    const std::int64_t n_pixels = Pixelisation(map.nside).n_pixels();
    ensure(std::int64_t(map.value.size()) == n_pixels, "a map has one value a pixel");
    // 1024 values a row is the usual layout of large maps (HEALPix, common practice).
    const std::string form = n_pixels % 1024 == 0 ? "1024D" : "1D";
    fits::TableWriter writer(path, "MAP", {{column, form, unit}});
    write_cards(writer, map, n_pixels);
    std::vector<double> marked = map.value;
    std::replace_if(
        marked.begin(), marked.end(), [](double v) { return std::isnan(v); }, unseen);
    writer.write(0, 0, marked);
    writer.close();
}

}  // namespace deviascope
