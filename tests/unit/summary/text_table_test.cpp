// SPDX-License-Identifier: GPL-2.0-or-later
#include "summary/text_table.h"
#include "deviascope/core/grouped_number.h"

#include <catch2/catch.hpp>
#include <limits>
#include <string>

#include "summary/rounding.h"

using namespace deviascope;

TEST_CASE("numbers are rounded to two digits of their uncertainty", "[summary]") {
    CHECK(rounded(1.23456, 0.0123) == "1.235");
    CHECK(rounded(1.23456, 0.0996) == "1.23");  // 0.0996 is 0.10 to two digits
    CHECK(rounded(1.23456, 0.0949) == "1.235");
    CHECK(rounded(412.3, 57.0) == "412");
    CHECK(rounded(412.3, 3.0) == "412.3");
    CHECK(rounded(148213.0, 163.0) == "148 210");
    CHECK(rounded(-0.0001, 0.1) == "0.00");
    CHECK(rounded(-1234567.0, 20.0) == "-1 234 567");
    CHECK(rounded(1.23358673, 3.7e-7) == "1.23358673");
    CHECK(rounded(3.75, 0.0) == "3.750");
    CHECK(rounded(0.0, 0.0) == "0");
    CHECK(rounded(std::numeric_limits<double>::quiet_NaN(), 1.0) == "-");
    CHECK(rounded(Interval{1.18, 1.571}, 0.1955) == "1.18 to 1.57");
    CHECK(short_number(11897.4) == "11 900");
    CHECK(short_number(0.0123456) == "0.0123");
    CHECK(grouped(123) == "123");
    CHECK(grouped(1234) == "1 234");
    CHECK(grouped(12345) == "12 345");
    CHECK(grouped(-1234567) == "-1 234 567");
}

TEST_CASE("text is folded at blanks within the page", "[summary]") {
    const std::string words = "aaaa bbbb " + std::string(120, 'c') + " dd";
    // Ten letters, then a word longer than a line is cut, at the width left by the indent.
    CHECK(folded(words, 4, "1. ") == " 1. aaaa bbbb\n    " + std::string(96, 'c') + "\n    " +
                                         std::string(24, 'c') + " dd\n");
    CHECK(folded("", 2) == "  \n");
    // Letters, not bytes, are counted: 100 of two bytes each fill a line.
    std::string accented;
    for (int letter = 0; letter < 100; ++letter) accented += "\u00e9";
    CHECK(folded(accented, 0) == accented + "\n");
}

TEST_CASE("tables align their columns and keep to the page", "[summary]") {
    TextTable table("lrr");
    table.row({"", "one", "two"});
    table.row({"first", "1.5", "200"});
    table.rule();
    table.row({"second", "12.5"});
    CHECK(table.text() ==
          "            one   two\n"
          "  first     1.5   200\n"
          "  -------------------\n"
          "  second   12.5\n");
}

TEST_CASE("a long name stands on its own line and a long last cell is folded", "[summary]") {
    const std::string name(95, 'n');
    TextTable table("lr");
    table.row({name, "1.25"});
    CHECK(table.text() == "  " + name + "\n" + std::string(96, ' ') + "1.25\n");

    TextTable verdicts("lrl");
    verdicts.row({"all", "0.9", std::string(60, 'x') + " " + std::string(60, 'y')});
    CHECK(verdicts.text() == "  all   0.9   " + std::string(60, 'x') + "\n" +
                                 std::string(14, ' ') + std::string(60, 'y') + "\n");
}
