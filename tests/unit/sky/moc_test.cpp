// SPDX-License-Identifier: GPL-2.0-or-later
#include "deviascope/sky/moc.h"

#include <catch2/catch.hpp>
#include <cmath>
#include <string>
#include <vector>

#include "core/fits/fits_file.h"
#include "deviascope/core/error.h"
#include "deviascope/core/random.h"
#include "deviascope/sky/pixelisation.h"
#include "temporary_folder.h"

using namespace deviascope;
using deviascope::test::TemporaryFolder;
using Ranges = std::vector<Moc::Range>;
using Numbers = std::vector<std::int64_t>;

namespace {

// MOC 2.0, IVOA Recommendation 2022-07-27: the worked example "1/1 2 4 2/12-14 21 23 25 8/",
// its NUNIQ numbers and the same region as ranges of order 29 (end excluded).
const Numbers example_uniq{17, 18, 20, 76, 77, 78, 85, 87, 89};
const Ranges example_ranges{{72057594037927936, 270215977642229760},
                            {288230376151711744, 360287970189639680},
                            {378302368699121664, 396316767208603648},
                            {414331165718085632, 432345564227567616},
                            {450359962737049600, 468374361246531584}};

struct Cards {
    std::string ordering = "NUNIQ", coordsys = "C", dimension = "SPACE";
    std::string form = "1K";
};

/// A MOC file made card by card, not by the writer under test.
std::filesystem::path write_file(const TemporaryFolder& folder,
                                 const Numbers& numbers,
                                 const Cards& cards = {}) {
    fits::TableWriter writer(folder / "a.moc.fits", "MOC", {{"UNIQ", cards.form, ""}});
    if (!cards.ordering.empty()) writer.card("ORDERING", cards.ordering, "");
    if (!cards.coordsys.empty()) writer.card("COORDSYS", cards.coordsys, "");
    if (!cards.dimension.empty()) writer.card("MOCDIM", cards.dimension, "");
    writer.write(0, 0, numbers);
    writer.close();
    return folder / "a.moc.fits";
}

MocFile read_back(const Numbers& numbers, const Cards& cards = {}) {
    const TemporaryFolder folder;
    return read_moc(write_file(folder, numbers, cards));
}

Numbers flattened(const Ranges& ranges) {
    Numbers numbers;
    for (const Moc::Range& range : ranges) {
        numbers.push_back(range.begin);
        numbers.push_back(range.end);
    }
    return numbers;
}

/// Random pixels of orders 0 to 8.
Moc random_region(std::uint64_t seed, int n) {
    Stream stream(seed, Purpose::test, 0, 0, 0);
    Ranges ranges;
    for (int i = 0; i < n; ++i) {
        const int order = static_cast<int>(uniform(stream) * 9.0);
        const auto n_pixels = static_cast<double>(std::int64_t{12} << 2 * order);
        const auto pixel = static_cast<std::int64_t>(uniform(stream) * n_pixels);
        const int shift = 2 * (29 - order);
        ranges.push_back({pixel << shift, (pixel + 1) << shift});
    }
    return Moc(ranges);
}

}  // namespace

TEST_CASE("the worked example of the MOC standard reads alike in both encodings", "[sky]") {
    const MocFile by_number = read_back(example_uniq);
    CHECK(by_number.region.ranges() == example_ranges);
    CHECK(by_number.region.sky_fraction() == 0.09375);
    CHECK(by_number.region.order() == 2);
    CHECK(by_number.frame == Frame::icrs);
    Cards range;
    range.ordering = "RANGE";
    CHECK(read_back(flattened(example_ranges), range).region.ranges() == example_ranges);
    range.form = "2K";
    CHECK(read_back(flattened(example_ranges), range).region.ranges() == example_ranges);
    Cards old;  // version 1.1: 32-bit numbers, no MOCDIM
    old.dimension = "";
    old.form = "1J";
    CHECK(read_back(example_uniq, old).region.ranges() == example_ranges);
}

TEST_CASE("MOC numbers of all orders are understood", "[sky]") {
    // (order, pixel) = uniq: (0,0) 4, (0,11) 15, (1,47) 63, (6,49151) 65535, (10,0) 4194304,
    // (29, last) 4611686018427387903, calculated from the standard's definition.
    CHECK(read_back({4}).region.share_of(0, 0) == 1.0);
    CHECK(read_back({15}).region.share_of(11, 0) == 1.0);
    CHECK(read_back({63}).region.share_of(11, 0) == 0.25);
    CHECK(read_back({65535}).region.share_of(49151, 6) == 1.0);
    CHECK(read_back({4194304}).region.share_of(0, 9) == 0.25);
    const Moc last = read_back({4611686018427387903}).region;
    CHECK(last.ranges() == Ranges{{3458764513820540927, 3458764513820540928}});
    CHECK(last.order() == 29);
}

TEST_CASE("a written MOC is well-formed and reads back the same region", "[sky]") {
    const TemporaryFolder folder;
    for (const int n : {0, 1, 30, 300}) {
        const Moc region = random_region(301, n);
        write_moc(folder / "b.fits", region);
        const MocFile back = read_moc(folder / "b.fits");
        CHECK(back.region.ranges() == region.ranges());
        CHECK(back.frame == Frame::icrs);
        CHECK(is_moc(folder / "b.fits"));
    }
    // Four siblings stand as their parent, ascending.
    write_moc(folder / "c.fits", Moc(example_ranges));
    const fits::Table table(folder / "c.fits");
    Numbers numbers(static_cast<std::size_t>(table.n_rows()));
    table.read(table.columns()[0], 0, numbers);
    CHECK(numbers == example_uniq);
    CHECK(table.integer_card("MOCORD_S") == 2);
    CHECK(table.text_card("MOCVERS") == "2.0");
    write_moc(folder / "d.fits", Moc({{0, std::int64_t{12} << 58}}));
    CHECK(fits::Table(folder / "d.fits").n_rows() == 12);
}

TEST_CASE("a MOC holds the directions of its pixels and no others", "[sky]") {
    const Moc region = random_region(302, 60);
    for (const int order : {0, 3, 6, 9}) {
        const Pixelisation grid(1 << order);
        std::int64_t n_wrong = 0;
        double covered = 0.0;
        const std::int64_t step = order < 9 ? 1 : 97;
        for (std::int64_t pixel = 0; pixel < grid.n_pixels(); pixel += step) {
            const double share = region.share_of(grid.nested_of_ring(pixel), order);
            covered += share;
            const bool inside = region.contains(grid.centre(pixel));
            n_wrong += (share == 1.0 && !inside) || (share == 0.0 && inside);
        }
        CHECK(n_wrong == 0);
        if (step == 1)
            CHECK(covered / static_cast<double>(grid.n_pixels()) ==
                  Approx(region.sky_fraction()).epsilon(1e-12));
    }
    CHECK_FALSE(Moc().contains(Direction::UnitX()));
    CHECK(Moc().order() == 0);
    CHECK_THROWS_AS(region.contains(Direction(2, 0, 0)), InternalError);
    CHECK_THROWS_AS(region.share_of(12, 0), InternalError);
    CHECK_THROWS_AS(Moc({{5, 5}}), InternalError);
}

TEST_CASE("touching and overlapping ranges of a MOC become one", "[sky]") {
    CHECK(Moc({{30, 40}, {0, 10}, {10, 20}, {35, 37}, {39, 50}}).ranges() ==
          Ranges{{0, 20}, {30, 50}});
    CHECK(Moc({{0, 20}, {30, 50}}).order() == 29);
    CHECK(Moc({{16, 32}}).order() == 27);
}

TEST_CASE("faults of a MOC file are named", "[sky]") {
    Cards cards;
    const auto refused = [&](const Numbers& numbers, const std::string& part) {
        CHECK_THROWS_WITH(read_back(numbers, cards), Catch::Contains(part));
    };
    refused({4, 3}, "value 2 of the MOC: the number is 3; 4 x 4^order + pixel");
    refused({-4}, "the number is -4");
    refused({4611686018427387904}, "the number is 4611686018427387904");
    cards.dimension = "TIME";
    refused({4}, "MOCDIM: its value is TIME; SPACE");
    cards.dimension = "SPACE";
    cards.coordsys = "X";
    refused({4}, "COORDSYS: its value is X");
    cards.coordsys = "C";
    cards.form = "1D";
    refused({4}, "column UNIQ: its form is 1D; an integer column");
    cards.form = "1K";
    cards.ordering = "RANGE";
    refused({4}, "the MOC holds 1 numbers; starts and ends in turn");
    refused({0, 4, 9, 9}, "value 3 of the MOC: the range is 9 … 9");
    refused({0, (std::int64_t{12} << 58) + 1}, "the range is 0 …");
    cards.ordering = "RING";
    refused({4}, "no binary table in it is a MOC");
}
