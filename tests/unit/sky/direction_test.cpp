// SPDX-License-Identifier: GPL-2.0-or-later
#include "deviascope/sky/direction.h"

#include <Eigen/Geometry>
#include <catch2/catch.hpp>
#include <cmath>
#include <numbers>

#include "deviascope/core/error.h"
#include "deviascope/core/random.h"

using namespace deviascope;

namespace {

constexpr double degree = std::numbers::pi / 180.0;
constexpr double eps = 0x1p-52;

/// The plain form in 80-bit arithmetic.
Eigen::Vector3d exact_direction(double lon_deg, double lat_deg) {
    const long double d = std::numbers::pi_v<long double> / 180;
    const long double lon = lon_deg * d;
    const long double lat = lat_deg * d;
    return {double(std::cos(lat) * std::cos(lon)),
            double(std::cos(lat) * std::sin(lon)),
            double(std::sin(lat))};
}

/// A direction anywhere on the sky, or very near an axis in two draws of three.
Direction hard_direction(Stream& stream) {
    const double pick = uniform(stream);
    const double size = pick < 1.0 / 3.0 ? 1.0 : std::pow(10.0, -18.0 * uniform(stream));
    const double axis = uniform(stream);
    Eigen::Vector3d v;
    for (double& component : v) component = size * normal(stream);
    if (pick >= 1.0 / 3.0) v += Eigen::Vector3d::Unit(int(3.0 * axis));
    return v.normalized();
}

}  // namespace

TEST_CASE("directions on the axes are exact", "[sky]") {
    CHECK(direction_of(0, 0) == Direction(1, 0, 0));
    CHECK(direction_of(90, 0) == Direction(0, 1, 0));
    CHECK(direction_of(180, 0) == Direction(-1, 0, 0));
    CHECK(direction_of(270, 0) == Direction(0, -1, 0));
    CHECK(direction_of(-90, 0) == Direction(0, -1, 0));
    CHECK(direction_of(360, 0) == Direction(1, 0, 0));
    CHECK(direction_of(360e15, 0) == Direction(1, 0, 0));
    CHECK(direction_of(123.4, 90) == Direction(0, 0, 1));
    CHECK(direction_of(123.4, -90) == Direction(0, 0, -1));
}

TEST_CASE("longitude and latitude at poles, seams and extreme lengths", "[sky]") {
    const auto check = [](const Eigen::Vector3d& v, double lon, double lat) {
        INFO(v.transpose());
        const LonLat at = lon_lat_of(v);
        CHECK(at.lon_deg == lon);
        CHECK(at.lat_deg == lat);
        CHECK_FALSE(std::signbit(at.lon_deg));
    };
    check({0, 0, 1}, 0, 90);
    check({-0.0, -0.0, -1}, 0, -90);
    check({1, -0.0, 0}, 0, 0);
    check({1, -1e-300, 0}, 0, 0);  // -5.7e-299 deg + 360 rounds to 360, which is 0
    check({-1, 0, 0}, 180, 0);
    check({-1, -0.0, 0}, 180, 0);
    check({0, -1, 0}, 270, 0);
    check({1e300, 1e300, 0}, 45, 0);
    check({0, 3e-320, 0}, 90, 0);
    CHECK(lon_lat_of({1, -1e-14, 0}).lon_deg < 360.0);
    CHECK_THROWS_AS(lon_lat_of({0, 0, 0}), InternalError);
    CHECK_THROWS_AS(lon_lat_of({1, std::nan(""), 0}), InternalError);
}

TEST_CASE("direction_of agrees with the plain form in 80-bit arithmetic", "[sky]") {
    // Bound: one rounding of the angle in radians (at most pi/4), one each of sine, cosine and
    // product: under 4 eps = 8.9e-16 in any component.
    Stream stream(101, Purpose::test, 0, 0, 0);
    for (int draw = 0; draw < 20000; ++draw) {
        const double lon = 720.0 * uniform(stream) - 360.0;
        const double lat = 180.0 * uniform(stream) - 90.0;
        INFO("lon " << lon << " lat " << lat);
        REQUIRE((direction_of(lon, lat) - exact_direction(lon, lat)).cwiseAbs().maxCoeff() <
                4 * eps);
    }
}

TEST_CASE("a direction survives longitude and latitude and back", "[sky]") {
    Stream stream(102, Purpose::test, 0, 0, 0);
    for (int draw = 0; draw < 20000; ++draw) {
        const Direction d = hard_direction(stream);
        const LonLat at = lon_lat_of(d);
        REQUIRE(at.lon_deg >= 0.0);
        REQUIRE(at.lon_deg < 360.0);
        REQUIRE(std::abs(at.lat_deg) <= 90.0);
        // 360 deg is known to 2.8e-14 deg = 5e-16 rad.
        REQUIRE((direction_of(at.lon_deg, at.lat_deg) - d).norm() < 2e-15);
    }
}

TEST_CASE("separation holds from nearly equal to nearly opposite", "[sky]") {
    CHECK(separation({1, 0, 0}, {1, 0, 0}) == 0.0);
    CHECK(separation({1, 0, 0}, {-2, 0, 0}) == std::numbers::pi);
    CHECK(separation({1, 0, 0}, {0, 1e-200, 0}) == std::numbers::pi / 2);
    CHECK(separation({1e300, 0, 0}, {1e300, 1e290, 0}) == Approx(1e-10).epsilon(1e-14));
    CHECK_THROWS_AS(separation({1, 0, 0}, {0, 0, 0}), InternalError);
    // On the equator the angle is the difference of longitudes, which is exact here.
    for (const double angle_deg :
         {0x1p-40, 0x1p-20, 1.0, 60.0, 120.0, 179.0, 180.0 - 0x1p-20}) {
        INFO(angle_deg);
        const double angle = separation(direction_of(0, 0), direction_of(angle_deg, 0));
        CHECK(std::abs(angle - angle_deg * degree) < 4 * eps);
    }
}
