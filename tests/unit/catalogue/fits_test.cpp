// SPDX-License-Identifier: GPL-2.0-or-later
#include <catch2/catch.hpp>
#include <cmath>
#include <cstdint>
#include <fstream>
#include <limits>
#include <numeric>

#include "core/fits/fits_file.h"
#include "deviascope/catalogue/table.h"
#include "deviascope/core/error.h"
#include "temporary_folder.h"

using namespace deviascope;
using test::TemporaryFolder;

namespace {

const double nan_value = std::numeric_limits<double>::quiet_NaN();

/// A table of `n` rows: RA (degrees, double), S (float; NaN in row 1), N (integer), V (pairs).
void write_table(const std::filesystem::path& path, std::int64_t n) {
    fits::TableWriter file(
        path,
        "SOURCES",
        {{"RA", "D", "deg"}, {"S", "E", "mJy"}, {"N", "J", ""}, {"V", "2D", ""}});
    const auto size = static_cast<std::size_t>(n);
    std::vector<double> ra(size);
    std::vector<double> s(size, 0.5);
    std::vector<std::int64_t> number(size);
    std::iota(ra.begin(), ra.end(), 0.25);
    std::iota(number.begin(), number.end(), -1);
    if (n > 1) s[1] = nan_value;
    file.write(0, 0, ra);
    file.write(1, 0, s);
    file.write(2, 0, number);
    file.write(3, 0, std::vector<double>(2 * size, 1.0));
    file.close();
}

}  // namespace

TEST_CASE("FITS columns come as doubles, in the order asked for, with missing values as NaN",
          "[catalogue]") {
    const TemporaryFolder folder;
    write_table(folder / "dunlin.fits", 3);
    const auto reader = open_table(folder / "dunlin.fits", "SOURCES", {"n", "RA", "S"});
    CHECK(reader->n_rows() == 3);
    CHECK(reader->unit_of(1) == "deg");
    CHECK(reader->place_of_row(0) == "row 1");
    TableChunk chunk;
    REQUIRE(reader->next(chunk));
    CHECK(chunk.column[0] == std::vector<double>{-1.0, 0.0, 1.0});
    CHECK(chunk.column[1] == std::vector<double>{0.25, 1.25, 2.25});
    CHECK(chunk.column[2][0] == 0.5);
    CHECK(std::isnan(chunk.column[2][1]));
    CHECK_FALSE(reader->next(chunk));
}

TEST_CASE("FITS tables longer than a chunk arrive whole and in order", "[catalogue]") {
    const TemporaryFolder folder;
    const std::int64_t n = 50001;
    write_table(folder / "dunlin.fits", n);
    const auto reader = open_table(folder / "dunlin.fits", "1", {"RA", "N"});
    TableChunk chunk;
    std::int64_t row = 0;
    std::int64_t n_wrong = 0;
    while (reader->next(chunk)) {
        REQUIRE(chunk.first_row == row);
        for (std::size_t i = 0; i < chunk.column[0].size(); ++i, ++row) {
            n_wrong += chunk.column[0][i] != static_cast<double>(row) + 0.25;
            n_wrong += chunk.column[1][i] != static_cast<double>(row - 1);
        }
    }
    CHECK(row == n);
    CHECK(n_wrong == 0);
}

TEST_CASE("FITS faults are named: no column, vector column, no table, cut short",
          "[catalogue]") {
    const TemporaryFolder folder;
    const auto path = folder / "dunlin.fits";
    write_table(path, 2000);
    CHECK_THROWS_WITH(open_table(path, {}, {"R"}),
                      Catch::Contains("no column `R`") && Catch::Contains("RA, S, N, V"));
    CHECK_THROWS_WITH(open_table(path, {}, {"V"}),
                      Catch::Contains("column V") && Catch::Contains("2 values a row"));
    CHECK_THROWS_AS(open_table(path, "LANTERN", {"RA"}), InputError);
    CHECK_THROWS_AS(open_table(path, "7", {"RA"}), InputError);
    std::filesystem::resize_file(path, std::filesystem::file_size(path) / 2);
    CHECK_THROWS_AS(open_table(path, {}, {"RA"}), InputError);
}

TEST_CASE("an empty FITS table has no chunk", "[catalogue]") {
    const TemporaryFolder folder;
    write_table(folder / "dunlin.fits", 0);
    TableChunk chunk;
    CHECK_FALSE(open_table(folder / "dunlin.fits", {}, {"RA"})->next(chunk));
}
