// SPDX-License-Identifier: GPL-2.0-or-later
// Input that is legal but suspicious: what is said about it, and that honest input is left
// alone.
#include <fmt/format.h>

#include <catch2/catch.hpp>
#include <cmath>
#include <numbers>

#include "counts/position_watch.h"
#include "deviascope/core/random.h"
#include "small_survey.h"

using namespace deviascope;
using test::SmallSurvey;

namespace {

struct Position {
    double lon, lat;
};

/// Isotropic positions in degrees.
std::vector<Position> isotropic(std::size_t n, std::uint64_t seed) {
    Stream stream(seed, Purpose::test, 2, 0, 0);
    std::vector<Position> all(n);
    for (Position& position : all) {
        position.lon = 360.0 * uniform(stream);
        position.lat = std::asin(2.0 * uniform(stream) - 1.0) * 180.0 / std::numbers::pi;
    }
    return all;
}

std::vector<std::string> suspicions_of(const std::vector<Position>& positions) {
    PositionWatch watch;
    for (const Position& position : positions) watch.add(position.lon, position.lat);
    return watch.suspicions();
}

std::vector<Position> scaled(std::vector<Position> positions, double lon, double lat) {
    for (Position& position : positions) position = {position.lon * lon, position.lat * lat};
    return positions;
}

/// Warnings of a survey of one bin with these sources.
std::vector<std::string> warnings_of(const std::vector<Position>& positions,
                                     const std::vector<Exclusion>& exclude = {}) {
    SmallSurvey survey;
    std::string rows;
    for (const Position& position : positions)
        rows += fmt::format("{},{},1,0\n", position.lon, position.lat);
    survey.add_catalogue("a.csv", rows);
    survey.add_bin("all");
    survey.input.exclude = exclude;
    return survey.count(16).cuts.warnings;
}

}  // namespace

TEST_CASE("positions that look like radians or hours are said to", "[counts]") {
    const auto degrees = isotropic(5000, 321);
    CHECK(suspicions_of(degrees).empty());
    const double radian = std::numbers::pi / 180.0;
    const auto radians = suspicions_of(scaled(degrees, radian, radian));
    REQUIRE(radians.size() == 1);
    CHECK_THAT(radians[0],
               Catch::StartsWith("longitudes run from 0.0") && Catch::Contains(" to 6.28") &&
                   Catch::EndsWith("the positions look like radians, and are read as degrees"));
    auto west = scaled(degrees, radian, radian);
    for (Position& position : west) position.lon -= std::numbers::pi;
    CHECK(suspicions_of(west).size() == 1);
    const auto hours = suspicions_of(scaled(degrees, 1.0 / 15.0, 1.0));
    REQUIRE(hours.size() == 1);
    CHECK_THAT(hours[0], Catch::Contains("the longitudes look like hours"));
    // A narrow field is not suspicious, nor are few rows.
    CHECK(suspicions_of(scaled(degrees, 0.05, 0.05)).empty());
    CHECK(suspicions_of(scaled(isotropic(99, 321), radian, radian)).empty());
}

TEST_CASE("rows at exactly the same place are counted, in any order, in bounded memory",
          "[counts]") {
    for (const std::size_t n : {1000UL, 15000UL, 400000UL}) {
        INFO(n);
        auto positions = isotropic(n, 322);
        CHECK(suspicions_of(positions).empty());
        // Every twentieth row is listed twice: 1/21 of all rows.
        for (std::size_t row = 0; row < n; row += 20) positions.push_back(positions[row]);
        const auto forward = suspicions_of(positions);
        REQUIRE(forward.size() == 1);
        CHECK_THAT(forward[0], Catch::Contains("stand at exactly the place of an earlier row"));
        CHECK_THAT(forward[0], Catch::StartsWith("about 4.") || Catch::StartsWith("about 5"));
        if (n <= 15000) CHECK_THAT(forward[0], Catch::StartsWith("about 4.8 % of the rows"));
        CHECK(suspicions_of({positions.rbegin(), positions.rend()}) == forward);
    }
}

TEST_CASE("sources far more numerous in one hemisphere than the exposure says are said to be",
          "[counts]") {
    const auto all = isotropic(20000, 323);
    CHECK(warnings_of(all).empty());
    // The southern half of the survey was never observed, and nothing says so.
    std::vector<Position> north;
    for (const Position& position : all)
        if (position.lat > 0.0) north.push_back(position);
    const auto warnings = warnings_of(north);
    REQUIRE(warnings.size() == 1);
    CHECK_THAT(warnings[0],
               Catch::Contains("bin all: the hemisphere about lon ") &&
                   Catch::Contains("deg (icrs) holds ") &&
                   Catch::Contains("check the frame and unit of the positions"));
    // With the cut that says so, all is well.
    CHECK(warnings_of(north, {{BelowExclusion{4.0}, Frame::icrs}}).empty());
    // A large but possible dipole is no fault: keep sources with probability 1 + 0.1 sin(lat).
    std::vector<Position> dipole;
    Stream stream(324, Purpose::test, 3, 0, 0);
    for (const Position& position : all)
        if (1.1 * uniform(stream) <
            1.0 + 0.1 * std::sin(position.lat * std::numbers::pi / 180.0))
            dipole.push_back(position);
    CHECK(warnings_of(dipole).empty());
}

TEST_CASE("suspicions reach the table of cuts with the rest", "[counts]") {
    const double radian = std::numbers::pi / 180.0;
    const auto warnings = warnings_of(scaled(isotropic(20000, 325), radian, radian));
    REQUIRE(warnings.size() == 2);
    CHECK_THAT(warnings[0], Catch::Contains("look like radians"));
    CHECK_THAT(warnings[1], Catch::Contains("the hemisphere about lon 3, lat 0 deg (icrs)"));
}
