// SPDX-License-Identifier: GPL-2.0-or-later
#include "core/fits/fits_file.h"

#include <fitsio.h>

#include <catch2/catch.hpp>
#include <cmath>
#include <cstdint>
#include <limits>
#include <string>
#include <vector>

#include "deviascope/core/error.h"
#include "temporary_folder.h"

using namespace deviascope;
using deviascope::test::TemporaryFolder;

namespace {

const double nan_value = std::numeric_limits<double>::quiet_NaN();
const double infinity = std::numeric_limits<double>::infinity();

std::vector<double> column(const fits::Table& table, const std::string& name) {
    for (const fits::Column& c : table.columns()) {
        if (c.name != name) continue;
        std::vector<double> values(std::size_t(table.n_rows() * c.repeat));
        table.read(c, 0, values);
        return values;
    }
    throw std::runtime_error("no column " + name);
}

/// A FITS file put together card by card, so that the wrapper is not tested against its writer.
class RawFits {
  public:
    RawFits& card(const std::string& text) {
        header_ += text + std::string(80 - text.size(), ' ');
        return *this;
    }
    RawFits& end() {
        card("END");
        pad(header_, ' ');
        bytes_ += header_;
        header_.clear();
        return *this;
    }
    RawFits& primary() {
        return card("SIMPLE  =                    T")
            .card("BITPIX  =                    8")
            .card("NAXIS   =                    0")
            .card("EXTEND  =                    T")
            .end();
    }
    RawFits& table_start(int width, int rows, int fields) {
        return card("XTENSION= 'BINTABLE'")
            .card("BITPIX  =                    8")
            .card("NAXIS   =                    2")
            .card("NAXIS1  = " + std::to_string(width))
            .card("NAXIS2  = " + std::to_string(rows))
            .card("PCOUNT  =                    0")
            .card("GCOUNT  =                    1")
            .card("TFIELDS = " + std::to_string(fields));
    }
    RawFits& data(std::string bytes) {
        pad(bytes, '\0');
        bytes_ += bytes;
        return *this;
    }
    const std::string& bytes() const { return bytes_; }

  private:
    static void pad(std::string& block, char fill) {
        block += std::string((2880 - block.size() % 2880) % 2880, fill);
    }
    std::string header_, bytes_;
};

/// Big-endian bytes of an integer, as FITS 4.0 section 5.2 stores them.
std::string big_endian(std::uint64_t value, int n_bytes) {
    std::string bytes;
    for (int at = n_bytes - 1; at >= 0; --at) bytes += char((value >> (8 * at)) & 0xff);
    return bytes;
}

}  // namespace

TEST_CASE("a FITS table reads every numeric type with scaling and null values",
          "[core][fits]") {
    // FITS Standard 4.0, section 7.3 (binary tables): TFORM codes L B I J K E D, physical value
    // = TZERO + TSCAL x field, unsigned integers by TZERO = 2^15, 2^31, 2^63, TNULL before
    // scaling; logical fields hold 'T', 'F' or 0 (null).
    RawFits file;
    file.primary().table_start(1 + 1 + 2 + 2 + 4 + 8 + 4 + 8, 2, 8);
    int n = 0;
    for (const char* form : {"L", "B", "I", "I", "J", "K", "E", "D"})
        file.card("TFORM" + std::to_string(++n) + "  = '" + form + "       '");
    n = 0;
    for (const char* name : {"FLAG", "SIGNED", "WORD", "UWORD", "LONG", "UHUGE", "REAL", "BIG"})
        file.card("TTYPE" + std::to_string(++n) + "  = '" + name + "'");
    file.card("TZERO2  = -128")
        .card("TNULL3  = -999")
        .card("TSCAL3  = 0.5")
        .card("TZERO3  = 10");
    file.card("TZERO4  = 32768").card("TZERO6  = 9223372036854775808").card("TUNIT7  = 'mJy'");
    file.card("TSCAL8  = 2.0").end();
    const std::string row_one = std::string("T") + big_endian(0x80, 1) +
                                big_endian(std::uint64_t(-999), 2) + big_endian(0xffff, 2) +
                                big_endian(std::uint64_t(-7), 4) +
                                big_endian(0x8000000000000005, 8) + big_endian(0x7f800000, 4) +
                                big_endian(0x3ff8000000000000, 8);
    const std::string row_two = std::string(1, '\0') + big_endian(0, 1) + big_endian(6, 2) +
                                big_endian(0x8000, 2) + big_endian(0x7fffffff, 4) +
                                big_endian(0x7fffffffffffffff, 8) + big_endian(0x7fc00000, 4) +
                                big_endian(0x0000000000000001, 8);
    file.data(row_one + row_two);
    TemporaryFolder folder;
    const fits::Table table(folder.write("types.fits", file.bytes()));

    CHECK(table.n_rows() == 2);
    CHECK(table.rows_at_a_time() >= 1);
    REQUIRE(table.columns().size() == 8);
    CHECK(table.columns()[6].unit == "mJy");
    CHECK(table.columns()[6].form == "E");
    const auto flag = column(table, "FLAG");
    CHECK(flag[0] == 1);
    CHECK(std::isnan(flag[1]));
    CHECK(column(table, "SIGNED") == std::vector<double>{0, -128});
    const auto word = column(table, "WORD");
    CHECK(std::isnan(word[0]));
    CHECK(word[1] == 13);
    CHECK(column(table, "UWORD") == std::vector<double>{32767, 0});
    CHECK(column(table, "LONG") == std::vector<double>{-7, 2147483647});
    CHECK(column(table, "UHUGE") == std::vector<double>{5, 0x1p64});
    const auto real = column(table, "REAL");
    CHECK(real[0] == infinity);
    CHECK(std::isnan(real[1]));
    CHECK(column(table, "BIG") == std::vector<double>{3, 2 * 0x1p-1074});
}

TEST_CASE("columns that are not numbers are listed and refused", "[core][fits]") {
    RawFits file;
    file.primary().table_start(3 + 8 + 8 + 1, 1, 4);
    file.card("TFORM1  = '3A'").card("TTYPE1  = 'NAME'").card("TFORM2  = 'C'");
    file.card("TTYPE2  = 'WAVE'").card("TFORM3  = '1PE(0)'").card("TTYPE3  = 'LIST'");
    file.card("TFORM4  = '8X'").card("TTYPE4  = 'BITS'").end().data(std::string(20, '\0'));
    TemporaryFolder folder;
    const fits::Table table(folder.write("text.fits", file.bytes()));
    REQUIRE(table.columns().size() == 4);
    for (const fits::Column& c : table.columns()) {
        CHECK_FALSE(c.is_numeric);
        double value = 0;
        CHECK_THROWS_AS(table.read(c, 0, {&value, 1}), InputError);
    }
    CHECK(table.columns()[2].repeat == 0);
    CHECK_THROWS_WITH(
        column(table, "NAME"),
        Catch::Matchers::Contains(
            "text.fits: column NAME: its form is 3A; a numeric or logical column"));
}

TEST_CASE("a written FITS table reads back, under names the library would interpret",
          "[core][fits]") {
    TemporaryFolder folder;
    for (const char* name : {"plain.fits",
                             "dunlin[1].fits",
                             "!bang.fits",
                             "a+2",
                             "(x).fits.gz",
                             "mem:.fits",
                             " blank.fits"}) {
        INFO(name);
        const auto path = folder / name;
        const std::vector<double> flux{1.5, nan_value, -infinity, 0x1p-1074};
        const std::vector<std::int64_t> ids{1, -2, std::int64_t(1) << 52, 4};
        fits::TableWriter writer(path, "SOURCES", {{"FLUX", "D", "mJy"}, {"ID", "K", ""}});
        writer.card("PURPOSE", std::string("dunlin's"), "an invented survey");
        writer.card("NSIDE", std::int64_t(64), "");
        writer.card("WIDTH", 0.1, "");
        writer.write(0, 0, std::span(flux).first(2));
        writer.write(0, 2, std::span(flux).subspan(2));
        writer.write(1, 0, ids);
        CHECK_FALSE(std::filesystem::exists(path));
        writer.close();

        const fits::Table table(path);
        CHECK(table.n_rows() == 4);
        const auto read = column(table, "FLUX");
        CHECK(read[0] == 1.5);
        CHECK(std::isnan(read[1]));
        CHECK(read[2] == -infinity);
        CHECK(read[3] == 0x1p-1074);
        CHECK(column(table, "ID") == std::vector<double>{1, -2, 0x1p52, 4});
        CHECK(table.columns()[0].unit == "mJy");
        CHECK(table.text_card("PURPOSE") == "dunlin's");
        CHECK(table.text_card("EXTNAME") == "SOURCES");
        CHECK(table.integer_card("NSIDE") == 64);
        CHECK_FALSE(table.text_card("ABSENT"));
        CHECK_FALSE(table.integer_card("ABSENT"));
        CHECK_THROWS_AS(table.text_card("NSIDE"), InputError);
        CHECK_THROWS_AS(table.integer_card("PURPOSE"), InputError);
        CHECK_THROWS_AS(table.integer_card("WIDTH"), InputError);
    }
    std::size_t n_files = 0;
    for ([[maybe_unused]] const auto& entry :
         std::filesystem::directory_iterator(folder.path()))
        ++n_files;
    CHECK(n_files == 7);  // no temporary file is left behind
}

TEST_CASE("relative FITS names with a tilde or blanks are taken literally", "[core][fits]") {
    TemporaryFolder folder;
    const auto before = std::filesystem::current_path();
    std::filesystem::current_path(folder.path());
    for (const char* name : {"~lantern.fits", "  lantern.fits", "file://x"}) {
        INFO(name);
        if (std::string(name) == "file://x") std::filesystem::create_directory("file:");
        fits::TableWriter writer(name, "T", {{"V", "E", ""}});
        writer.write(0, 0, std::vector<double>{0.25});
        writer.close();
        CHECK(std::filesystem::exists(name));
        CHECK(column(fits::Table(name), "V") == std::vector<double>{0.25});
    }
    std::filesystem::current_path(before);
}

TEST_CASE("a FITS table left unclosed leaves nothing, and replaces nothing", "[core][fits]") {
    TemporaryFolder folder;
    const auto path = folder.write("kept.fits", "old");
    {
        fits::TableWriter writer(path, "T", {{"V", "D", ""}});
        writer.write(0, 0, std::vector<double>{1.0});
        CHECK(std::filesystem::exists(folder / "kept.fits.partial"));
    }
    CHECK_FALSE(std::filesystem::exists(folder / "kept.fits.partial"));
    CHECK(std::filesystem::file_size(path) == 3);
    folder.write("kept.fits.partial", "left by a killed run");
    fits::TableWriter writer(path, "T", {{"V", "J", ""}});
    CHECK_THROWS_AS(writer.write(0, 0, std::vector<std::int64_t>{std::int64_t(1) << 40}),
                    OutputError);
    writer.write(0, 0, std::vector<std::int64_t>{7});
    writer.close();
    CHECK(column(fits::Table(path), "V") == std::vector<double>{7});
}

TEST_CASE("HDUs are found by name, by number, or as the first binary table", "[core][fits]") {
    RawFits file;
    file.primary();
    file.card("XTENSION= 'IMAGE   '").card("BITPIX  =                    8");
    file.card("NAXIS   =                    0").card("PCOUNT  =                    0");
    file.card("GCOUNT  =                    1").card("EXTNAME = 'PICTURE'").end();
    for (const char* name : {"North", "SOUTH"}) {
        file.table_start(1, 1, 1).card("TFORM1  = 'B'").card("TTYPE1  = 'V'");
        file.card(std::string("EXTNAME = '") + name + "'").end();
        file.data(name[0] == 'N' ? "\1" : "\2");
    }
    TemporaryFolder folder;
    const auto path = folder.write("many.fits", file.bytes());
    CHECK(column(fits::Table(path), "V")[0] == 1);
    CHECK(column(fits::Table(path, "NORTH"), "V")[0] == 1);
    CHECK(column(fits::Table(path, "south"), "V")[0] == 2);
    CHECK(column(fits::Table(path, "2"), "V")[0] == 1);
    CHECK(column(fits::Table(path, "3"), "V")[0] == 2);
    CHECK_THROWS_WITH(fits::Table(path, "4"),
                      Catch::Matchers::EndsWith("many.fits: there is no HDU 4; 0 (the primary "
                                                "HDU) to 3; name an HDU of the file"));
    CHECK_THROWS_WITH(fits::Table(path, "east"),
                      Catch::Matchers::Contains("there is no HDU named east; its HDUs are "
                                                "PICTURE, North, SOUTH; name"));
    CHECK_THROWS_WITH(fits::Table(path, "0"), Catch::Matchers::Contains("not a binary table"));
    CHECK_THROWS_WITH(fits::Table(path, "picture"),
                      Catch::Matchers::Contains("HDU picture: it is not a binary table"));
}

TEST_CASE("files that are missing, foreign or cut short are refused in plain words",
          "[core][fits]") {
    TemporaryFolder folder;
    CHECK_THROWS_WITH(fits::Table(folder / "absent.fits"),
                      Catch::Matchers::Contains("absent.fits: there is no such file"));
    CHECK_THROWS_WITH(fits::Table(folder.path()),
                      Catch::Matchers::Contains("not a regular file"));
    CHECK_THROWS_AS(fits::Table(folder.write("foreign.fits", "lon,lat\n1,2\n")), InputError);
    CHECK_THROWS_AS(fits::Table(folder.write("empty.fits", "")), InputError);
    RawFits bare;
    bare.primary();
    CHECK_THROWS_WITH(fits::Table(folder.write("bare.fits", bare.bytes())),
                      Catch::Matchers::Contains("holds no binary table"));
    RawFits file;
    file.primary().table_start(8, 1000, 1).card("TFORM1  = 'D'").card("TTYPE1  = 'V'").end();
    file.data(std::string(8000, '\1'));
    const std::string whole = file.bytes();
    CHECK_NOTHROW(fits::Table(folder.write("whole.fits", whole)));
    for (const std::size_t kept :
         {whole.size() - 2880, whole.size() - 5000, std::size_t(5760)}) {
        CHECK_THROWS_WITH(fits::Table(folder.write("short.fits", whole.substr(0, kept))),
                          Catch::Matchers::Contains("ends before the last of its 1000 rows"));
    }
    CHECK_THROWS_AS(fits::TableWriter(folder / "no/such/folder.fits", "T", {{"V", "D", ""}}),
                    OutputError);
}
