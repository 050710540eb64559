// SPDX-License-Identifier: GPL-2.0-or-later
#include <fmt/format.h>
#include <zlib.h>

#include <catch2/catch.hpp>
#include <string>

#include "core/gzip/byte_source.h"
#include "deviascope/catalogue/table.h"
#include "deviascope/core/error.h"
#include "file_bytes.h"
#include "temporary_folder.h"

using namespace deviascope;
using test::TemporaryFolder;

namespace {

/// Compresses as the library does it, into one member.
std::string gzipped(const std::string& text) {
    const TemporaryFolder folder;
    const std::filesystem::path path = folder / "a.gz";
    gzFile file = gzopen(path.c_str(), "wb");
    REQUIRE(gzwrite(file, text.data(), static_cast<unsigned>(text.size())) ==
            static_cast<int>(text.size()));
    REQUIRE(gzclose(file) == Z_OK);
    return test::bytes_of(path);
}

std::vector<double> column_of(const std::filesystem::path& path, const std::string& name) {
    const auto reader = open_table(path, {}, {name});
    std::vector<double> all;
    TableChunk chunk;
    while (reader->next(chunk))
        all.insert(all.end(), chunk.column[0].begin(), chunk.column[0].end());
    return all;
}

std::string long_csv() {
    std::string text = "T,RA\n";
    for (int row = 0; row < 200000; ++row)
        text += fmt::format("{},{}\n", row % 5 == 0 ? "\"a,\nb\"" : "c", row);
    return text;
}

}  // namespace

TEST_CASE("a gzip CSV file reads as the plain one, whatever its name", "[catalogue]") {
    const TemporaryFolder folder;
    const std::string text = long_csv();
    const auto plain = column_of(folder.write("a.csv", text), "RA");
    CHECK(plain.size() == 200000);
    CHECK(column_of(folder.write("a.csv.gz", gzipped(text)), "RA") == plain);
    CHECK(column_of(folder.write("b.csv", gzipped(text)), "RA") == plain);
    // RFC 1952 section 2.2: members one after the other are one stream.
    const std::string two = gzipped(text.substr(0, 70001)) + gzipped(text.substr(70001));
    CHECK(column_of(folder.write("c.csv.gz", two), "RA") == plain);
    const auto reader = open_table(folder / "a.csv.gz", {}, {"RA"});
    TableChunk chunk;
    while (reader->next(chunk)) continue;
    CHECK(reader->place_of_row(5) == "line 8");  // after a record of two lines
}

TEST_CASE("a damaged or cut gzip file is refused at whichever byte", "[catalogue]") {
    const TemporaryFolder folder;
    const std::string whole = gzipped("RA,DEC\n" + std::string(2000, '1') + ",2\n3,4\n");
    for (std::size_t n = 2; n < whole.size(); ++n) {
        INFO(n);
        CHECK_THROWS_WITH(column_of(folder.write("a.csv.gz", whole.substr(0, n)), "RA"),
                          Catch::Contains("the compressed data end too early") ||
                              Catch::Contains("the compressed data are damaged"));
    }
    std::string bent = whole;
    bent[bent.size() - 6] ^= 1;  // of the checksum
    CHECK_THROWS_WITH(
        column_of(folder.write("a.csv.gz", bent), "RA"),
        Catch::Contains("the compressed data are damaged (incorrect data check)"));
}

TEST_CASE("what may not be compressed is refused by its content", "[catalogue]") {
    const TemporaryFolder folder;
    CHECK_THROWS_WITH(column_of(folder.write("a.gz", gzipped(gzipped("RA\n1\n"))), "RA"),
                      Catch::Contains("inside the gzip compression is another gzip file"));
    CHECK_THROWS_WITH(column_of(folder.write("a.gz", gzipped("\x89HDF\r\n\x1a\n")), "RA"),
                      Catch::Contains("inside the gzip compression is an HDF5 file"));
    CHECK_THROWS_WITH(column_of(folder.write("a.gz", gzipped("")), "RA"),
                      Catch::Contains("the file is empty"));
}

TEST_CASE("bytes of a source arrive whole in pieces of any size", "[core]") {
    const TemporaryFolder folder;
    const std::string text = long_csv();
    for (const bool compressed : {false, true}) {
        ByteSource source(folder.write("a", compressed ? gzipped(text) : text));
        std::string all, piece(4097, '\0');
        for (std::size_t n = 0; (n = source.read(piece)) > 0;) all += piece.substr(0, n);
        CHECK(all == text);
        CHECK(source.is_compressed() == compressed);
        CHECK(source.read(piece) == 0);
    }
    CHECK_THROWS_WITH(ByteSource(folder.path()), Catch::Contains("it is a folder"));
    CHECK_THROWS_WITH(ByteSource(folder / "absent"),
                      Catch::Contains("cannot be read (No such file or directory)"));
}
