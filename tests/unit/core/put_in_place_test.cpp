// SPDX-License-Identifier: GPL-2.0-or-later
// Files that are written under another name and put in place when they are complete.
#include <catch2/catch.hpp>
#include <string>
#include <vector>

#include "core/fits/fits_file.h"
#include "core/gzip/text_sink.h"
#include "deviascope/core/error.h"
#include "full_disk.h"
#include "temporary_folder.h"

using namespace deviascope;
using test::FullDisk;
using test::TemporaryFolder;

namespace {

namespace fs = std::filesystem;

std::ptrdiff_t n_entries(const TemporaryFolder& folder) {
    return std::distance(fs::directory_iterator(folder.path()), {});
}

const std::vector<fits::TableWriter::NewColumn> columns{{"S", "1D", ""}};

}  // namespace

TEST_CASE("a file that is given up before its end leaves nothing behind", "[core]") {
    const TemporaryFolder folder;
    {
        TextSink sink(folder / "a.csv", false);
        sink.write("one,two\n");
        fits::TableWriter table(folder / "a.fits", "TABLE", columns);
    }
    CHECK(n_entries(folder) == 0);
}

TEST_CASE("a file that cannot be put in place leaves nothing behind, and says so", "[core]") {
    const TemporaryFolder folder;
    for (const char* name : {"a.csv", "a.fits"}) fs::create_directory(folder / name);
    TextSink sink(folder / "a.csv", true);
    sink.write("one,two\n");
    CHECK_THROWS_WITH(sink.close(), Catch::Contains("a.csv: Is a directory"));
    fits::TableWriter table(folder / "a.fits", "TABLE", columns);
    CHECK_THROWS_WITH(table.close(), Catch::Contains("a.fits: Is a directory"));
    CHECK(n_entries(folder) == 2);
}

TEST_CASE("a disk that fills up while a text or table is written is an output error",
          "[core]") {
    const TemporaryFolder folder;
    const FullDisk disk(3000);
    CHECK_THROWS_WITH(
        [&] {
            TextSink sink(folder / "a.csv", false);
            for (int line = 0; line < 100000; ++line) sink.write("0.1,0.2,0.3\n");
            sink.close();
        }(),
        Catch::Contains("a.csv: File too large"));
    CHECK_THROWS_AS(
        [&] {
            fits::TableWriter table(folder / "a.fits", "TABLE", columns);
            table.write(0, 0, std::vector<double>(5000, 0.25));
            table.close();
        }(),
        OutputError);
    CHECK(n_entries(folder) == 0);
}
