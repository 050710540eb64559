// SPDX-License-Identifier: GPL-2.0-or-later
#include "deviascope/sky/healpix_map.h"

#include <catch2/catch.hpp>
#include <cmath>
#include <limits>
#include <string>
#include <vector>

#include "core/fits/fits_file.h"
#include "deviascope/core/error.h"
#include "deviascope/core/random.h"
#include "deviascope/sky/pixelisation.h"
#include "temporary_folder.h"

using namespace deviascope;
using Catch::Matchers::Contains;
using deviascope::test::TemporaryFolder;

namespace {

const double nan_value = std::numeric_limits<double>::quiet_NaN();

/// A map header that can be bent one card at a time. Cards set to "" are left out.
struct Cards {
    std::string pixtype = "HEALPIX", ordering = "RING", scheme = "IMPLICIT", coordsys = "G";
    std::int64_t nside = 1;
};

void add_cards(fits::TableWriter& writer, const Cards& cards) {
    if (!cards.pixtype.empty()) writer.card("PIXTYPE", cards.pixtype, "");
    if (!cards.ordering.empty()) writer.card("ORDERING", cards.ordering, "");
    if (!cards.scheme.empty()) writer.card("INDXSCHM", cards.scheme, "");
    if (!cards.coordsys.empty()) writer.card("COORDSYS", cards.coordsys, "");
    if (cards.nside != 0) writer.card("NSIDE", cards.nside, "");
}

std::vector<double> counting(std::size_t n) {
    std::vector<double> values(n);
    for (std::size_t at = 0; at < n; ++at) values[at] = double(at) + 0.5;
    return values;
}

HealpixMap read_implicit(const Cards& cards, const std::vector<double>& values = counting(12)) {
    TemporaryFolder folder;
    fits::TableWriter writer(folder / "map.fits", "MAP", {{"EXPOSURE", "D", ""}});
    add_cards(writer, cards);
    writer.write(0, 0, values);
    writer.close();
    return read_healpix_map(folder / "map.fits");
}

HealpixMap read_explicit(Cards cards,
                         const std::vector<double>& pixels,
                         const std::string& pixel_name = "PIXEL") {
    cards.scheme = cards.scheme == "IMPLICIT" ? "EXPLICIT" : cards.scheme;
    TemporaryFolder folder;
    fits::TableWriter writer(
        folder / "map.fits", "MAP", {{pixel_name, "D", ""}, {"EXPOSURE", "E", ""}});
    add_cards(writer, cards);
    writer.write(0, 0, pixels);
    writer.write(1, 0, counting(pixels.size()));
    writer.close();
    return read_healpix_map(folder / "map.fits");
}

}  // namespace

TEST_CASE("a written map reads back bit for bit", "[sky]") {
    TemporaryFolder folder;
    for (const int nside : {1, 2, 16, 64}) {
        for (const std::optional<Frame> frame : {std::optional<Frame>(),
                                                 std::optional(Frame::galactic),
                                                 std::optional(Frame::icrs),
                                                 std::optional(Frame::ecliptic)}) {
            HealpixMap map{nside, frame, {}};
            Stream stream(104, Purpose::test, std::uint64_t(nside), 0, 0);
            for (std::int64_t pixel = 0; pixel < Pixelisation(nside).n_pixels(); ++pixel)
                map.value.push_back(normal(stream));
            map.value[5] = nan_value;
            map.value[6] = 0x1p-1074;
            write_healpix_map(folder / "map.fits", map, "EXPOSURE", "1");
            const HealpixMap back = read_healpix_map(folder / "map.fits");
            CHECK(back.nside == nside);
            CHECK(back.frame == frame);
            REQUIRE(back.value.size() == map.value.size());
            CHECK(std::isnan(back.value[5]));
            map.value[5] = 0.0;
            std::vector<double> value = back.value;
            value[5] = 0.0;
            CHECK(value == map.value);
        }
    }
    CHECK_THROWS_AS(write_healpix_map(folder / "no/folder.fits", {1, {}, counting(12)}, "X"),
                    OutputError);
    CHECK_THROWS_AS(write_healpix_map(folder / "x.fits", {2, {}, counting(12)}, "X"),
                    InternalError);
}

TEST_CASE("COORDSYS is read in every spelling that is met", "[sky]") {
    // G, E, C: HEALPix FITS convention; the longer and lower-case forms and Q: common practice.
    const auto frame = [](const std::string& coordsys) {
        Cards cards;
        cards.coordsys = coordsys;
        return read_implicit(cards).frame;
    };
    for (const char* word : {"G", "g", "GALACTIC", "galactic", " Galactic "})
        CHECK(frame(word) == Frame::galactic);
    for (const char* word : {"C", "c", "Q", "q", "Celestial", "EQUATORIAL", "icrs"})
        CHECK(frame(word) == Frame::icrs);
    for (const char* word : {"E", "e", "Ecliptic"}) CHECK(frame(word) == Frame::ecliptic);
    CHECK_FALSE(frame(""));
    CHECK_FALSE(frame("  "));
    CHECK_THROWS_WITH(frame("SUPERGALACTIC"),
                      Contains("COORDSYS: its value is SUPERGALACTIC; G (galactic), C "));
    CHECK_THROWS_AS(frame("H"), InputError);
}

TEST_CASE("NESTED and partial maps land on their RING pixels", "[sky]") {
    Cards cards;
    cards.nside = 2;
    cards.ordering = "NESTED";
    const HealpixMap nested = read_implicit(cards, counting(48));
    // healpy 1.16.1: nest2ring(2, [0, 3, 44]) = 13, 0, 47.
    CHECK(nested.value[13] == 0.5);
    CHECK(nested.value[0] == 3.5);
    CHECK(nested.value[47] == 44.5);
    for (const char* scheme : {"EXPLICIT", ""}) {
        cards.scheme = scheme;
        const HealpixMap partial = read_explicit(cards, {44, 0, 3}, "pixel");
        CHECK(partial.value[47] == 0.5);
        CHECK(partial.value[13] == 1.5);
        CHECK(partial.value[0] == 2.5);
        CHECK(std::isnan(partial.value[1]));
    }
}

TEST_CASE("UNSEEN in either precision and NaN mean no value, infinities stay", "[sky]") {
    std::vector<double> values = counting(12);
    values[1] = -1.6375e30;
    values[2] = double(-1.6375e30f);
    values[3] = nan_value;
    values[4] = std::numeric_limits<double>::infinity();
    values[5] = -1.6e30;
    const HealpixMap map = read_implicit({}, values);
    CHECK(map.value[0] == 0.5);
    for (const std::size_t pixel : {1u, 2u, 3u}) CHECK(std::isnan(map.value[pixel]));
    CHECK(map.value[4] == values[4]);
    CHECK(map.value[5] == -1.6e30);
}

TEST_CASE("a wrong map is refused with the card or row at fault", "[sky]") {
    const auto bent = [](auto bend) {
        Cards cards;
        bend(cards);
        return read_implicit(cards);
    };
    CHECK_THROWS_WITH(bent([](Cards& c) { c.nside = 3; }),
                      Contains("map.fits: NSIDE: its value is 3; a power of two, 1 to 8192"));
    CHECK_THROWS_WITH(bent([](Cards& c) { c.nside = 0; }),
                      Contains("NSIDE: the card is missing"));
    CHECK_THROWS_WITH(bent([](Cards& c) { c.nside = 16384; }), Contains("NSIDE"));
    CHECK_THROWS_WITH(bent([](Cards& c) { c.nside = 2; }),
                      Contains("column EXPOSURE: 12 rows of 1 values; 48 values in all"));
    CHECK_THROWS_WITH(bent([](Cards& c) { c.ordering = ""; }),
                      Contains("ORDERING: the card is missing; RING or NESTED"));
    CHECK_THROWS_WITH(bent([](Cards& c) { c.ordering = "NUNIQ"; }),
                      Contains("ORDERING: its value is NUNIQ"));
    CHECK_THROWS_WITH(bent([](Cards& c) { c.scheme = "SPARSE"; }),
                      Contains("INDXSCHM: its value is SPARSE"));
    CHECK_THROWS_WITH(bent([](Cards& c) { c.scheme = "EXPLICIT"; }),
                      Contains("there is no numeric column PIXEL"));
    CHECK_THROWS_WITH(bent([](Cards& c) {
                          c.pixtype = "";
                          c.nside = 0;
                      }),
                      Contains("no binary table in it is a HEALPix map"));
    CHECK_NOTHROW(bent([](Cards& c) { c.pixtype = ""; }));
    CHECK_THROWS_WITH(
        read_explicit({}, {0, 12}),
        Contains("column PIXEL, row 2: the pixel number is 12; 0 to 11 for NSIDE 1"));
    CHECK_THROWS_WITH(read_explicit({}, {-1}), Contains("row 1: the pixel number is -1"));
    CHECK_THROWS_WITH(read_explicit({}, {0.5}), Contains("row 1: the pixel number is 0.5"));
    CHECK_THROWS_WITH(read_explicit({}, {nan_value}), Contains("row 1"));
    CHECK_THROWS_WITH(read_explicit({}, {4, 7, 4}),
                      Contains("pixel 4 is there more than once"));
}
