// SPDX-License-Identifier: GPL-2.0-or-later
#include "deviascope/sky/position_match.h"

#include <catch2/catch.hpp>

#include "deviascope/core/error.h"

using namespace deviascope;

TEST_CASE("positions match across the poles and longitude 0", "[sky]") {
    const double radius = 5.0 * radians_per_arcsec;
    const double second = 1.0 / 3600.0;
    const PositionIndex index({direction_of(10.0, 90.0 - second),
                               direction_of(359.9999, 20.0),
                               direction_of(180.0, -30.0),
                               direction_of(0.0, -90.0)},
                              radius);
    CHECK(index.has_neighbour(direction_of(190.0, 90.0 - 3.0 * second)));
    CHECK_FALSE(index.has_neighbour(direction_of(190.0, 90.0 - 5.0 * second)));
    CHECK(index.has_neighbour(direction_of(0.0001, 20.0)));
    CHECK_FALSE(index.has_neighbour(direction_of(0.002, 20.0)));
    CHECK(index.has_neighbour(direction_of(-179.9999, -30.0)));
    CHECK(index.has_neighbour(direction_of(77.0, -90.0 + 4.9 * second)));
    CHECK_FALSE(index.has_neighbour(direction_of(77.0, -90.0 + 5.1 * second)));
}

TEST_CASE("no positions, no matches", "[sky]") {
    const PositionIndex none({}, 1e-5), one({Direction::UnitX()}, 1e-5);
    CHECK_FALSE(none.has_neighbour(Direction::UnitX()));
    CHECK(none.matches_of(one) == 0);
    CHECK(one.matches_of(none) == 0);
    CHECK(one.matches_of(one) == 1);
}

TEST_CASE("a radius that is none is refused", "[sky]") {
    CHECK_THROWS_AS(PositionIndex({}, 0.0), InternalError);
    CHECK_THROWS_AS(PositionIndex({}, 0.2), InternalError);
}
