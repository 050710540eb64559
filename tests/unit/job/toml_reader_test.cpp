// SPDX-License-Identifier: GPL-2.0-or-later
#include "job/toml_reader.h"

#include <catch2/catch.hpp>
#include <limits>
#include <string>
#include <vector>

using namespace deviascope;

namespace {

/// The faults that `ask` leaves in a document, one a line; empty where there is none.
template <class Ask>
std::string faults_of(const std::string& text, Ask ask) {
    try {
        TomlDocument document(text, "f.toml");
        ask(document.root());
        document.finish();
    } catch (const UsageError& error) {
        return error.what();
    }
    return "";
}

/// Whether a number as written in TOML is within a range.
bool accepts(const std::string& written, const NumberRange& range) {
    return faults_of("x = " + written, [&](TomlTable t) { t.number("x", range); }).empty();
}

}  // namespace

TEST_CASE("a text that is not TOML is refused with line and column", "[job]") {
    const auto nothing = [](TomlTable) {};
    CHECK(faults_of("a = 1\na = 2\n", nothing) ==
          "f.toml:2:5: not TOML: in key-value pair: cannot redefine existing integer 'a'; "
          "a text in TOML 1.0 is allowed");
    CHECK(faults_of("[a]\nx = galactic\n", nothing) ==
          "f.toml:2:5: not TOML: in value: could not determine value type; "
          "a text in TOML 1.0 is allowed; write text in double quotes");
    CHECK_THAT(faults_of("\xff = 1", nothing), Catch::StartsWith("f.toml:1:1: not TOML: "));
    CHECK_THAT(faults_of("x = 99999999999999999999", nothing),
               Catch::Contains("not representable in 64 bits"));
}

TEST_CASE("an integer is accepted where a number is asked for, not the reverse", "[job]") {
    TomlDocument document("n = 3\nx = 3.0\n", "f.toml");
    CHECK(document.root().number("n") == 3.0);
    CHECK(document.root().integer("n", 0, 9) == 3);
    CHECK_FALSE(document.root().integer("x", 0, 9).has_value());
    CHECK_THROWS_WITH(document.finish(),
                      "f.toml:2:5: x: found 3.0; an integer from 0 to 9 is allowed");
}

TEST_CASE("a number is finite unless infinities are allowed, and never NaN", "[job]") {
    NumberRange with_infinity;
    with_infinity.infinite = true;
    for (const char* written : {"inf", "-inf", "+inf"}) {
        CHECK_FALSE(accepts(written, {}));
        CHECK(accepts(written, with_infinity));
    }
    CHECK_FALSE(accepts("nan", {}));
    CHECK_FALSE(accepts("nan", with_infinity));
}

TEST_CASE("ends of a range are in or out as it says", "[job]") {
    CHECK_FALSE(accepts("0", above(0)));
    CHECK(accepts("5e-324", above(0)));
    CHECK(accepts("0", at_least(0)));
    CHECK_FALSE(accepts("-1e-300", at_least(0)));
    CHECK(accepts("1", between(0, 1)));
    CHECK_FALSE(accepts("1.0000000000000002", between(0, 1)));
    CHECK_FALSE(accepts("1", inside(0, 1)));
    CHECK_FALSE(accepts("0", inside(0, 1)));
    CHECK(accepts("1", above_up_to(0, 1)));
    CHECK_FALSE(accepts("0", above_up_to(0, 1)));
    CHECK(above_up_to(0, 1).text() == "a number above 0 and at most 1");
    CHECK(inside(-90, 90).text() == "a number above -90 and below 90");
    CHECK(at_least(0).text() == "a finite number of at least 0");
    CHECK(NumberRange{}.text() == "a finite number");
}

TEST_CASE("each kind of value says what was found and what is allowed", "[job]") {
    struct Case {
        const char* text;
        void (*ask)(TomlTable);
        const char* fault;
    };
    const Case cases[] = {
        {"k = ''",
         [](TomlTable t) { t.text("k"); },
         "found \"\"; a text that is not empty is allowed"},
        {"k = 1",
         [](TomlTable t) { t.text("k"); },
         "found 1; a text that is not empty is allowed"},
        {"k = 'a'",
         [](TomlTable t) { t.number("k"); },
         "found \"a\"; a finite number is allowed"},
        {"k = true",
         [](TomlTable t) { t.number("k", above(0)); },
         "found true; a finite number above 0 is allowed"},
        {"k = 1", [](TomlTable t) { t.boolean("k"); }, "found 1; true or false is allowed"},
        {"k = 'tru'",
         [](TomlTable t) { t.boolean("k"); },
         "found \"tru\"; true or false is allowed"},
        {"k = -1",
         [](TomlTable t) { t.integer("k", 0, std::numeric_limits<std::int64_t>::max()); },
         "found -1; an integer of at least 0 is allowed"},
        {"k = [1, 2]",
         [](TomlTable t) { t.numbers("k", 3); },
         "found [1, 2]; an array of 3 finite numbers is allowed"},
        {"k = [1, 2, 'x']",
         [](TomlTable t) { t.numbers("k", 3); },
         "found [1, 2, \"x\"]; an array of 3 finite numbers is allowed"},
        {"k = [1, 2, 3, 4, 5, 6, 7]",
         [](TomlTable t) { t.numbers("k", 3); },
         "found an array of 7 values; an array of 3 finite numbers is allowed"},
        {"k = [[1, 2], [3]]",
         [](TomlTable t) { t.matrix("k", 2); },
         "found [[1, 2], [3]]; an array of 2 rows of 2 finite numbers is allowed"},
        {"k = []",
         [](TomlTable t) { t.texts("k"); },
         "found []; a text or an array of texts is allowed"},
        {"k = ['a', 1]",
         [](TomlTable t) { t.texts("k"); },
         "found [\"a\", 1]; a text or an array of texts is allowed"},
        {"k = 1979-05-27",
         [](TomlTable t) { t.table("k"); },
         "found a date or time; a table is allowed"},
        {"k = {}",
         [](TomlTable t) { t.tables("k"); },
         "found a table; an array of tables, [[k]], is allowed"},
        {"k = 'galatic'",
         [](TomlTable t) {
             t.choice("k", {"galactic", "icrs"});
         },
         "found \"galatic\"; \"galactic\" or \"icrs\" is allowed; did you mean \"galactic\"?"},
        {"k = 7",
         [](TomlTable t) {
             t.choice("k", {"galactic", "icrs"});
         },
         "found 7; \"galactic\" or \"icrs\" is allowed"},
    };
    for (const Case& c : cases) {
        INFO(c.text);
        CHECK(faults_of(c.text, c.ask) == std::string("f.toml:1:5: k: ") + c.fault);
    }
}

TEST_CASE("values that fit are read as they are", "[job]") {
    TomlDocument document(
        "t = 'a'\nl = ['a', 'b']\nb = true\nv = [1, 2.5, 3]\nm = [[1, 2], [3, 4.5]]\nc = 'y'\n",
        "f.toml");
    const TomlTable t = document.root();
    CHECK(t.text("t") == "a");
    CHECK(t.texts("t") == std::vector<std::string>{"a"});
    CHECK(t.texts("l") == std::vector<std::string>{"a", "b"});
    CHECK(t.boolean("b") == true);
    CHECK(*t.numbers("v", 3) == Eigen::Vector3d(1, 2.5, 3));
    CHECK(*t.matrix("m", 2) == (Eigen::Matrix2d() << 1, 2, 3, 4.5).finished());
    CHECK(t.choice("c", {"x", "y"}) == std::size_t{1});
    CHECK(t.keys() == std::vector<std::string>{"t", "l", "b", "v", "m", "c"});
    CHECK_NOTHROW(document.finish());
}

TEST_CASE("required keys are reported where their table begins, absent tables too", "[job]") {
    const auto ask = [](TomlTable root) {
        const TomlTable job = root.table("job");
        job.integer("seed", 0, 9, Presence::required);
        root.table("velocity").choice("prior", {"a"}, Presence::required);
        root.tables("survey", Presence::required);
    };
    CHECK(faults_of("\n[job]\n", ask) ==
          "f.toml:1:1: velocity.prior: missing; \"a\" is required\n"
          "f.toml:1:1: survey: missing; an array of tables, [[survey]], is required\n"
          "f.toml:2:1: job.seed: missing; an integer from 0 to 9 is required");
}

TEST_CASE("what is inside a faulty table gives no further faults", "[job]") {
    const auto ask = [](TomlTable root) {
        root.table("job").table("inner").integer("seed", 0, 9, Presence::required);
    };
    CHECK(faults_of("job = 3", ask) == "f.toml:1:7: job: found 3; a table is allowed");
}

TEST_CASE("keys nobody asks for are reported with the nearest known key", "[job]") {
    const auto ask = [](TomlTable root) {
        const TomlTable job = root.table("job");
        job.integer("seed", 0, 9);
        job.text("title");
    };
    CHECK(faults_of("[job]\ntitel = 'x'\n\"a b\" = 1\n[other]\n", ask) ==
          "f.toml:2:1: job.titel: unknown key; known here: \"seed\", \"title\"; did you mean "
          "\"title\"?\n"
          "f.toml:3:1: job.\"a b\": unknown key; known here: \"seed\", \"title\"\n"
          "f.toml:4:2: other: unknown key; known here: \"job\"");
}

TEST_CASE("tables of an array are counted from 1 and faults come in the order of lines",
          "[job]") {
    const auto ask = [](TomlTable root) {
        for (const TomlTable& survey : root.tables("survey")) {
            survey.number("late");
            for (const TomlTable& bin : survey.tables("bin")) bin.number("mean");
        }
        root.number("x");
    };
    CHECK(faults_of("x = 'a'\n[[survey]]\nbin = [{ mean = 1 }, { mean = 'b' "
                    "}]\n[[survey]]\nlate = 'c'\n"
                    "[[survey.bin]]\nmean = 'd'\n",
                    ask) ==
          "f.toml:1:5: x: found \"a\"; a finite number is allowed\n"
          "f.toml:3:31: survey[1].bin[2].mean: found \"b\"; a finite number is allowed\n"
          "f.toml:5:8: survey[2].late: found \"c\"; a finite number is allowed\n"
          "f.toml:7:8: survey[2].bin[1].mean: found \"d\"; a finite number is allowed");
}

TEST_CASE("faults of another file stand where it is named", "[job]") {
    CHECK(faults_of("a = 1\nprior = 'p'\nb = 'x'\n",
                    [](TomlTable root) {
                        root.number("b");
                        root.text("prior");
                        root.adopt("prior", {{"p.toml:9:9: sd", "found 0", "", ""}});
                        root.text("a");
                    }) ==
          "f.toml:1:5: a: found 1; a text that is not empty is allowed\n"
          "p.toml:9:9: sd: found 0\n"
          "f.toml:3:5: b: found \"x\"; a finite number is allowed");
}
