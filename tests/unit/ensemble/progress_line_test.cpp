// SPDX-License-Identifier: GPL-2.0-or-later
#include "ensemble/progress_line.h"
#include "deviascope/core/grouped_number.h"

#include <catch2/catch.hpp>

using namespace deviascope;

TEST_CASE("a progress line tells step, R-hat, effective draws and time left", "[ensemble]") {
    Standing standing;
    standing.step = 12400;
    standing.worst_rhat = 1.0404;
    standing.effective_draws = 2100.9;
    standing.effective_draws_wanted = 10000;
    standing.seconds_left = 170;
    CHECK(
        progress_line(standing) ==
        "step 12 400 · worst R-hat 1.04 · 2 100 of 10 000 effective draws · about 3 min left");
    standing.seconds_left = 12.2;
    CHECK_THAT(progress_line(standing), Catch::EndsWith("about 13 s left"));
    standing.seconds_left = 7260;
    CHECK_THAT(progress_line(standing), Catch::EndsWith("about 2 h 1 min left"));
}

TEST_CASE("a progress line leaves out what is not known", "[ensemble]") {
    Standing standing;
    standing.step = 128;
    standing.is_warming_up = true;
    CHECK(progress_line(standing) == "step 128 · warming up");
}

TEST_CASE("digits are grouped in threes", "[ensemble]") {
    CHECK(grouped(0) == "0");
    CHECK(grouped(999) == "999");
    CHECK(grouped(1000) == "1 000");
    CHECK(grouped(1234567) == "1 234 567");
    CHECK(grouped(-123456) == "-123 456");
}
