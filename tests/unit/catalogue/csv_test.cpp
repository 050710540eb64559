// SPDX-License-Identifier: GPL-2.0-or-later
#include <fmt/format.h>

#include <catch2/catch.hpp>
#include <cmath>
#include <limits>

#include "deviascope/catalogue/table.h"
#include "deviascope/core/error.h"
#include "temporary_folder.h"

using namespace deviascope;
using test::TemporaryFolder;

namespace {

using Columns = std::vector<std::vector<double>>;

/// All rows of a file, chunk after chunk.
Columns read_all(TableReader& reader, std::size_t n_columns) {
    Columns all(n_columns);
    TableChunk chunk;
    while (reader.next(chunk)) {
        REQUIRE(chunk.first_row == std::ssize(all[0]));
        for (std::size_t i = 0; i < n_columns; ++i)
            all[i].insert(all[i].end(), chunk.column[i].begin(), chunk.column[i].end());
    }
    return all;
}

Columns read_csv(const std::string& text, const std::vector<std::string>& names) {
    const TemporaryFolder folder;
    const auto reader = open_table(folder.write("dunlin.csv", text), {}, names);
    return read_all(*reader, names.size());
}

/// The message with which a file is refused, without its folder.
std::string refusal(const std::string& text, const std::vector<std::string>& names) {
    try {
        read_csv(text, names);
    } catch (const InputError& error) {
        const std::string message = error.what();
        return message.substr(message.rfind('/', message.find(".csv")) + 1);
    }
    return "accepted";
}

const double infinity = std::numeric_limits<double>::infinity();

}  // namespace

TEST_CASE("CSV columns come in the order asked for, whatever the order in the file",
          "[catalogue]") {
    const Columns got = read_csv("S,RA,DEC\n10,1,-2\n20,3.5,4e1\n", {"DEC", "S"});
    CHECK(got == Columns{{-2.0, 40.0}, {10.0, 20.0}});
}

TEST_CASE("the last line of a CSV file may lack its line end", "[catalogue]") {
    // RFC 4180 section 2, rule 2.
    CHECK(read_csv("RA,DEC\n1,2\n3,4", {"RA"}) == Columns{{1.0, 3.0}});
    CHECK(read_csv("RA,DEC", {"RA"}) == Columns{{}});
    CHECK(read_csv("RA,DEC\n1,\"2\"", {"DEC"}) == Columns{{2.0}});
}

TEST_CASE("CRLF, a byte-order mark and empty lines at the end are allowed", "[catalogue]") {
    const std::string text = "\xEF\xBB\xBFRA,DEC\r\n1,2\r\n3,4\r\n\r\n\n";
    CHECK(read_csv(text, {"RA", "DEC"}) == Columns{{1.0, 3.0}, {2.0, 4.0}});
}

TEST_CASE("quoted fields hold commas, line breaks and doubled quotes", "[catalogue]") {
    // RFC 4180 section 2, rules 5 to 7.
    const std::string text =
        "name,\"RA \"\"J2000\"\"\",note,DEC\r\n"
        "\"a, b\",\"1.5\",\"first\r\nsecond\n\nfourth\",2\r\n"
        "\"\"\"c\"\"\",3,\"\",\"-4\"\r\n";
    CHECK(read_csv(text, {"RA \"J2000\"", "DEC"}) == Columns{{1.5, 3.0}, {2.0, -4.0}});
}

TEST_CASE("rows after a quoted line break are placed by their line", "[catalogue]") {
    const TemporaryFolder folder;
    const auto plain = open_table(folder.write("a.csv", "RA,T\n1,x\n2,y\n"), {}, {"RA"});
    read_all(*plain, 1);
    CHECK(plain->place_of_row(0) == "line 2");
    CHECK(plain->place_of_row(1) == "line 3");
    const auto broken =
        open_table(folder.write("b.csv", "RA,T\n1,\"x\n\nx\"\n2,y\n"), {}, {"RA"});
    read_all(*broken, 1);
    CHECK(broken->place_of_row(0) == "line 2");
    CHECK(broken->place_of_row(1) == "line 5");
    CHECK_FALSE(broken->n_rows().has_value());
}

TEST_CASE("blank and nan are missing, numbers may carry blanks and a plus sign",
          "[catalogue]") {
    const Columns got = read_csv(
        "S,T\n,1\n  ,1\nnan,1\nNaN,1\n\"\",1\n +1.5 ,1\n\t-.5e-3,1\ninf,1\n-inf,1\n5.,1\n"
        "1e-310,1\n",
        {"S"});
    for (std::size_t row = 0; row < 5; ++row) CHECK(std::isnan(got[0][row]));
    const std::vector<double> rest(got[0].begin() + 5, got[0].end());
    CHECK(rest == std::vector<double>{1.5, -0.0005, infinity, -infinity, 5.0, 1e-310});
}

TEST_CASE("CSV names match exactly first, then whatever their case", "[catalogue]") {
    CHECK(read_csv("ra,RA,x\n1,2,3\n", {"RA"}) == Columns{{2.0}});
    CHECK(read_csv("ra , Dec,x\n1,2,3\n", {"DEC", "RA"}) == Columns{{2.0}, {1.0}});
    CHECK_THAT(refusal("ra,Ra,x\n1,2,3\n", {"RA"}), Catch::Contains("number 1, 2"));
    CHECK_THAT(refusal("RA,RA,x\n1,2,3\n", {"RA"}), Catch::Contains("number 1, 2"));
}

TEST_CASE("a missing CSV column is answered with the nearest name", "[catalogue]") {
    CHECK(refusal("RA,DECL,FLUX\n", {"DEC"}) ==
          "dunlin.csv: there is no column `DEC`; the columns are RA, DECL, FLUX; did you mean "
          "`DECL`?");
}

TEST_CASE("an unreadable number is named with line, column and value", "[catalogue]") {
    CHECK_THAT(refusal("RA,S\n1,2\n3,12x\n", {"RA", "S"}),
               Catch::StartsWith("dunlin.csv: line 3: column S: `12x` is not a number"));
    for (const char* value : {"1,5 x", "1 2", "--1", "+-1", "+", "0x10", "1e", "N/A", "1d3"}) {
        INFO(value);
        const std::string text = fmt::format("RA,S\n1,\"{}\"\n", value);
        CHECK_THAT(refusal(text, {"S"}), Catch::Contains(fmt::format("`{}` is not", value)));
    }
    CHECK_THAT(refusal("RA,S\n1,1e400\n", {"S"}), Catch::Contains("too large or too small"));
    CHECK(refusal("RA,S\n1,rubbish\n", {"RA"}) == "accepted");  // not asked for
}

TEST_CASE("a ragged or empty line is named with its number", "[catalogue]") {
    CHECK_THAT(refusal("RA,S\n1,2\n3\n", {"RA"}),
               Catch::StartsWith("dunlin.csv: line 3: the record has 1 fields; each record "
                                 "has 2 fields"));
    CHECK_THAT(refusal("RA,S\n1,2,\n", {"RA"}), Catch::Contains("line 2: the record has 3"));
    CHECK_THAT(refusal("RA,S\n1,\"2\",4\n", {"RA"}),
               Catch::Contains("line 2: the record has 3"));
    CHECK_THAT(refusal("RA,S\n1,2\n\n\n3,4\n", {"RA"}),
               Catch::Contains("line 3: the line is empty, and rows follow"));
}

TEST_CASE("quotes in the wrong place are refused with their line", "[catalogue]") {
    CHECK_THAT(refusal("RA,S\n1,2\n3,5\" N\n", {"RA"}),
               Catch::Contains("line 3: a double quote"));
    CHECK_THAT(refusal("RA,S\n1,\"2\"x\n", {"RA"}), Catch::Contains("line 2: a double quote"));
    CHECK_THAT(refusal("RA,S\n1,\"2\n3\"\r,4\n", {"RA"}), Catch::Contains("line 3: a double"));
    CHECK_THAT(refusal("RA,S\n1,\"2\n3,4\n", {"RA"}),
               Catch::Contains("line 2: the record that begins here holds a quoted field "
                               "without an end"));
}

TEST_CASE("what is no CSV text is refused by its content", "[catalogue]") {
    using namespace std::string_literals;
    CHECK_THAT(refusal("\x1f\x8b\x08 rest"s, {"RA"}), Catch::Contains("compressed data"));
    CHECK_THAT(refusal("\x89HDF\r\n\x1a\n rest"s, {"RA"}), Catch::Contains("superblock"));
    std::string behind_a_user_block(512, '\0');
    behind_a_user_block += "\x89HDF\r\n\x1a\n";
    CHECK_THAT(refusal(behind_a_user_block, {"RA"}),
               Catch::Contains("bad byte number in an address"));
    CHECK_THAT(refusal("RA,S\0\n"s, {"RA"}), Catch::Contains("neither a FITS or HDF5 file nor"));
    CHECK_THAT(refusal("", {"RA"}), Catch::Contains("the file is empty"));
}

TEST_CASE("a folder, an absent file and a table name for CSV are refused", "[catalogue]") {
    const TemporaryFolder folder;
    CHECK_THROWS_WITH(open_table(folder.path(), {}, {"RA"}), Catch::Contains("it is a folder"));
    CHECK_THROWS_AS(open_table(folder / "absent.csv", {}, {"RA"}), InputError);
    const auto path = folder.write("a.csv", "RA\n1\n");
    CHECK_THROWS_WITH(open_table(path, "SOURCES", {"RA"}), Catch::Contains("SOURCES"));
    CHECK_THROWS_AS(open_table(path, {}, {"RA", "RA"}), InternalError);
}

TEST_CASE("records that straddle the blocks of the reader arrive whole", "[catalogue]") {
    // More than two blocks of 1 MiB, lines of unlike lengths, every seventh with quotes.
    std::string text = "note,RA,DEC\n";
    const int n_rows = 60000;
    for (int row = 0; row < n_rows; ++row) {
        const std::string note(static_cast<std::size_t>(row % 61), 'n');
        text += row % 7 == 0 ? fmt::format("\"{},\n\"\"\",{},\"{}\"\n", note, row, -row)
                             : fmt::format("{},{},{}\r\n", note, row, -row);
    }
    REQUIRE(text.size() > 2U << 20U);
    const Columns got = read_csv(text, {"RA", "DEC"});
    REQUIRE(std::ssize(got[0]) == n_rows);
    int n_wrong = 0;
    for (int row = 0; row < n_rows; ++row) {
        const auto at = static_cast<std::size_t>(row);
        n_wrong += got[0][at] != row || got[1][at] != -row;
    }
    CHECK(n_wrong == 0);
}

TEST_CASE("a record longer than a block arrives whole", "[catalogue]") {
    const std::string note(3U << 20U, 'n');
    const Columns got = read_csv(fmt::format("T,RA\n\"{},\n\",1\n{},2\n", note, note), {"RA"});
    CHECK(got == Columns{{1.0, 2.0}});
}
