// SPDX-License-Identifier: GPL-2.0-or-later
#include "sky/many_directions.h"

#include <catch2/catch.hpp>
#include <cmath>
#include <limits>
#include <vector>

#include "deviascope/core/random.h"
#include "deviascope/sky/frame.h"

using namespace deviascope;

namespace {

std::vector<Direction> batch(const std::vector<double>& lon,
                             const std::vector<double>& lat,
                             const Eigen::Matrix3d& to) {
    std::vector<Direction> out(lon.size());
    directions_of(lon, lat, to, out);
    return out;
}

}  // namespace

TEST_CASE("directions of many positions are those of one at a time", "[sky]") {
    std::vector<double> lon, lat;
    Stream stream(331, Purpose::test, 0, 0, 0);
    for (int i = 0; i < 20000; ++i) {
        lon.push_back(540.0 * uniform(stream) - 180.0);
        lat.push_back(180.0 * uniform(stream) - 90.0);
    }
    // Where quarter turns meet, and beside them.
    for (int quarter = -8; quarter <= 8; ++quarter)
        for (const double offset : {-45.0, -1e-9, -1e-300, 0.0, 1e-300, 1e-9, 45.0}) {
            lon.push_back(90.0 * quarter + offset);
            lat.push_back(quarter % 2 == 0 ? 90.0 - std::abs(offset) : offset);
        }
    for (const Frame to : {Frame::icrs, Frame::galactic}) {
        const Eigen::Matrix3d turn = rotation(Frame::icrs, to);
        const auto many = batch(lon, lat, turn);
        double worst = 0.0;
        for (std::size_t i = 0; i < lon.size(); ++i) {
            if (std::abs(lon[i]) > 720.0) continue;
            worst = std::max(
                worst, (many[i] - turn * direction_of(lon[i], lat[i])).cwiseAbs().maxCoeff());
        }
        CHECK(worst < 1e-15);
    }
}

TEST_CASE("directions are exact on the axes, and unsound positions harmless", "[sky]") {
    const double nan = std::numeric_limits<double>::quiet_NaN();
    const double infinity = std::numeric_limits<double>::infinity();
    const std::vector<double> lon{
        0, 90, 180, 270, 360, -90, -180, 17, 17, nan, 0, 800, infinity};
    const std::vector<double> lat{0, 0, 0, 0, 0, 0, 0, 90, -90, 0, nan, 0, 0};
    const std::vector<Direction> expected{{1, 0, 0},
                                          {0, 1, 0},
                                          {-1, 0, 0},
                                          {0, -1, 0},
                                          {1, 0, 0},
                                          {0, -1, 0},
                                          {-1, 0, 0},
                                          {0, 0, 1},
                                          {0, 0, -1},
                                          {1, 0, 0},
                                          {1, 0, 0},
                                          {1, 0, 0},
                                          {1, 0, 0}};
    CHECK(batch(lon, lat, Eigen::Matrix3d::Identity()) == expected);
}
