// SPDX-License-Identifier: GPL-2.0-or-later
#include "deviascope/sky/exclusion.h"

#include <algorithm>
#include <catch2/catch.hpp>
#include <cmath>
#include <cstdint>

#include "deviascope/core/error.h"
#include "deviascope/sky/pixelisation.h"

using namespace deviascope;

namespace {

std::int64_t n_kept(int nside, const Exclusion& exclusion, Frame frame = Frame::galactic) {
    const ExclusionTest test(exclusion, frame);
    const auto centres = Pixelisation(nside).centres();
    return std::count_if(
        centres.begin(), centres.end(), [&](const Direction& c) { return !test.excludes(c); });
}

}  // namespace

TEST_CASE("an exclusion is labelled in the words of the job file", "[sky]") {
    CHECK(Exclusion{BandExclusion{15.0}, Frame::galactic}.label() == "band 15 deg galactic");
    CHECK(Exclusion{DiscExclusion{83.6, 22.0, 1.5}, Frame::icrs}.label() ==
          "lon 83.6 lat 22 radius 1.5 deg icrs");
    CHECK(Exclusion{BelowExclusion{-40.0}, Frame::icrs}.label() == "below -40 deg icrs");
    CHECK(Exclusion{AboveExclusion{40.5}, Frame::ecliptic}.label() ==
          "above 40.5 deg ecliptic");
}

TEST_CASE("a band of 30 deg keeps the rings that lie on its edge", "[sky]") {
    // Gorski et al. 2005, ApJ 622, 759: in the equatorial belt ring i has z = 4/3 - 2i/(3
    // nside), so |z| = 1/2 is ring 5 nside/4 exactly where 4 divides nside. Kept are the rings
    // i = 1 … 5 nside/4: 2 nside (nside - 1) pixels of the cap and (nside/4 + 1) rings of 4
    // nside.
    for (const int nside : {4, 8, 64, 256}) {
        INFO(nside);
        const std::int64_t kept_north =
            2LL * nside * (nside - 1) + (nside / 4 + 1) * 4LL * nside;
        for (const double half_width : {30.0, std::asin(0.5) * 180.0 / 3.14159265358979323846})
            CHECK(n_kept(nside, {BandExclusion{half_width}, Frame::galactic}) ==
                  2 * kept_north);
        CHECK(n_kept(nside, {BandExclusion{30.0 + 1e-9}, Frame::galactic}) ==
              2 * (kept_north - 4LL * nside));
        CHECK(n_kept(nside, {BelowExclusion{30.0}, Frame::galactic}) == kept_north);
        CHECK(n_kept(nside, {AboveExclusion{-30.0}, Frame::galactic}) == kept_north);
    }
}

TEST_CASE("below and above keep the rings on their edge", "[sky]") {
    const Pixelisation grid(16);
    for (const double lat : {-30.0, 0.0, 30.0}) {
        std::int64_t at_or_north = 0;
        std::int64_t at_or_south = 0;
        for (const Direction& c : grid.centres()) {
            at_or_north += c.z() >= lat / 60.0;  // sin(30 deg) = 1/2, sin 0 = 0
            at_or_south += c.z() <= lat / 60.0;
        }
        CHECK(n_kept(16, {BelowExclusion{lat}, Frame::galactic}) == at_or_north);
        CHECK(n_kept(16, {AboveExclusion{lat}, Frame::galactic}) == at_or_south);
    }
    CHECK(n_kept(4, {BandExclusion{0.0}, Frame::galactic}) == 192);
    CHECK(n_kept(4, {BandExclusion{90.0}, Frame::galactic}) == 0);
    CHECK(n_kept(4, {BelowExclusion{-90.0}, Frame::galactic}) == 192);
    CHECK(n_kept(4, {AboveExclusion{90.0}, Frame::galactic}) == 192);
}

TEST_CASE("a disc leaves out the pixels whose centres are inside, however small it is",
          "[sky]") {
    const Pixelisation grid(64);
    const std::int64_t pixel = grid.pixel_at(direction_of(123.4, 30.0));
    const LonLat centre = lon_lat_of(grid.centre(pixel));
    const auto disc = [&](double radius) {
        return Exclusion{DiscExclusion{centre.lon_deg, centre.lat_deg, radius},
                         Frame::galactic};
    };
    CHECK(n_kept(64, disc(1e-6)) == grid.n_pixels() - 1);
    CHECK(n_kept(64, disc(0.0)) == grid.n_pixels());
    // Between centres, a disc smaller than a pixel removes none.
    const Direction corner = (grid.centre(pixel) + grid.centre(pixel + 1)).normalized();
    const LonLat between = lon_lat_of(corner);
    CHECK(n_kept(64, {DiscExclusion{between.lon_deg, between.lat_deg, 0.1}, Frame::galactic}) ==
          grid.n_pixels());
    // A disc whose edge goes through a centre keeps that pixel.
    const double reach =
        separation(grid.centre(pixel), grid.centre(pixel + 1)) * 180.0 / 3.14159265358979323846;
    const auto excludes_neighbour = [&](double radius) {
        return ExclusionTest(disc(radius), Frame::galactic).excludes(grid.centre(pixel + 1));
    };
    CHECK_FALSE(excludes_neighbour(reach));
    CHECK(excludes_neighbour(reach + 1e-9));
    CHECK_FALSE(excludes_neighbour(reach - 1e-9));
}

TEST_CASE("a large disc holds its share of the sky", "[sky]") {
    // Solid angle of a cap: 2 pi (1 - cos r). The count of centres differs from the area by
    // less than the pixels that the edge crosses, about 2 pi sin r / pixel size of them.
    for (const double radius_deg : {20.0, 90.0, 150.0}) {
        const double r = radius_deg * 3.14159265358979323846 / 180.0;
        const double n_pixels = 12.0 * 64 * 64;
        const double removed =
            n_pixels - double(n_kept(64, {DiscExclusion{200, -35, radius_deg}, Frame::icrs}));
        const double crossed = 2.0 * 3.14159265358979323846 * std::sin(r) /
                               std::sqrt(4.0 * 3.14159265358979323846 / n_pixels);
        CHECK(std::abs(removed - n_pixels * (1.0 - std::cos(r)) / 2.0) < crossed);
    }
    CHECK(n_kept(4, {DiscExclusion{0, 90, 180}, Frame::galactic}) == 0);
}

TEST_CASE("an exclusion obeys its own frame", "[sky]") {
    // The galactic pole in ICRS: RA 192.85948, Dec +27.12825 (Perryman & ESA 1997).
    const Exclusion pole_disc{DiscExclusion{192.85948, 27.12825, 10.0}, Frame::icrs};
    const Exclusion cap{AboveExclusion{80.0}, Frame::galactic};
    for (const Direction& c : Pixelisation(32).centres()) {
        REQUIRE(ExclusionTest(pole_disc, Frame::galactic).excludes(c) ==
                ExclusionTest(cap, Frame::galactic).excludes(c));
    }
    const ExclusionTest band({BandExclusion{15.0}, Frame::galactic}, Frame::icrs);
    CHECK(band.excludes(direction_of(266.4049948010, -28.9361739601)));  // galactic centre
    CHECK_FALSE(band.excludes(direction_of(192.85948, 27.12825)));       // galactic pole
}

TEST_CASE("an exclusion outside its range is a fault of the caller", "[sky]") {
    const auto make = [](auto region) { return ExclusionTest({region, {}}, Frame::icrs); };
    CHECK_THROWS_AS(make(BandExclusion{-1.0}), InternalError);
    CHECK_THROWS_AS(make(BandExclusion{90.5}), InternalError);
    CHECK_THROWS_AS(make(DiscExclusion{0, 0, std::nan("")}), InternalError);
    CHECK_THROWS_AS(make(DiscExclusion{0, 91, 1}), InternalError);
    CHECK_THROWS_AS(make(BelowExclusion{-91}), InternalError);
    CHECK_THROWS_AS(make(AboveExclusion{91}), InternalError);
}
