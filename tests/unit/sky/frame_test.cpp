// SPDX-License-Identifier: GPL-2.0-or-later
#include "deviascope/sky/frame.h"

#include <erfa.h>

#include <Eigen/LU>
#include <catch2/catch.hpp>
#include <cmath>

#include "deviascope/core/random.h"
#include "deviascope/sky/direction.h"

using namespace deviascope;

namespace {

constexpr double degree = 0.017453292519943295769236907684886127;

Direction from_radians(double lon, double lat) {
    Direction d;
    eraS2c(lon, lat, d.data());
    return d;
}

double largest(const Eigen::Matrix3d& m) {
    return m.cwiseAbs().maxCoeff();
}

}  // namespace

TEST_CASE("frames are named as in the job file", "[sky]") {
    CHECK(frame_names() == std::vector<std::string>{"galactic", "icrs", "ecliptic"});
    for (const std::string& name : frame_names()) CHECK(name_of(*frame_of_name(name)) == name);
    CHECK_FALSE(frame_of_name("Galactic"));
    CHECK_FALSE(frame_of_name(""));
}

TEST_CASE("the ICRS-to-galactic matrix is the one of the Hipparcos catalogue", "[sky]") {
    // R3(-32.93192 deg) R1(62.87175 deg) R3(282.85948 deg), exact by convention: Perryman & ESA
    // 1997, The Hipparcos and Tycho Catalogues, ESA SP-1200, Vol. 1, section 1.5.3 (section
    // number from memory). Digits: product as printed in eraIcrs2g (liberfa 2.0.0), recomputed
    // with mpmath to 25 digits.
    Eigen::Matrix3d published;
    published << -0.0548755604162153684923989, -0.8734370902348850487603832,
        -0.4838350155487132268317742, 0.4941094278755836735252224, -0.4448296299600111781466141,
        0.7469822444972188905273880, -0.8676661490190047011816165, -0.1980763734312015281804861,
        0.4559837761750669222721005;
    CHECK(largest(rotation(Frame::icrs, Frame::galactic) - published) < 1e-15);
    CHECK(largest(rotation(Frame::galactic, Frame::icrs) - published.transpose()) < 1e-15);
}

TEST_CASE("rotations reproduce the test values of SOFA and ERFA", "[sky]") {
    // Functions t_icrs2g and t_g2icrs of the SOFA/ERFA test program, tolerance 1e-14 there.
    const Direction icrs =
        from_radians(5.9338074302227188048671087, -1.1784870613579944551540570);
    const Direction galactic =
        from_radians(5.5850536063818546461558, -0.7853981633974483096157);
    CHECK((rotation(Frame::icrs, Frame::galactic) * icrs - galactic).norm() < 2e-15);
    CHECK((rotation(Frame::galactic, Frame::icrs) * galactic - icrs).norm() < 2e-15);
}

TEST_CASE("six points have their published places in three frames", "[sky]") {
    // liberfa 2.0.0: eraIcrs2g, and eraEqec06 at TT 2451545.0, given to 10 decimals of a
    // degree.
    struct Point {
        const char* name;
        double ra, dec, l, b, lambda, beta;
    };
    const Point points[] = {
        {"ICRS origin", 0, 0, 96.3372723434, -60.1885532676, 0.0000018849, -0.0000058482},
        {"ICRS pole", 0, 90, 122.93192, 27.12825, 89.9999883958, 66.5607186614},
        {"galactic pole", 192.85948, 27.12825, 0, 90, 180.0232244989, 29.8114443669},
        {"galactic centre",
         266.4049948010,
         -28.9361739601,
         0,
         0,
         266.8395254148,
         -5.5363241214},
        {"CMB apex",
         167.9419082211,
         -6.9442641383,
         264.021,
         48.253,
         171.6683694780,
         -11.1521062084},
        {"southern",
         83.633,
         -45.25,
         251.3039201601,
         -32.0164480036,
         77.7453871053,
         -68.4186027478}};
    for (const Point& p : points) {
        INFO(p.name);
        const double digits = 2e-10 * degree;
        const Direction icrs = direction_of(p.ra, p.dec);
        const Direction galactic = direction_of(p.l, p.b);
        const Direction ecliptic = direction_of(p.lambda, p.beta);
        CHECK(separation(rotation(Frame::icrs, Frame::galactic) * icrs, galactic) < digits);
        CHECK(separation(rotation(Frame::icrs, Frame::ecliptic) * icrs, ecliptic) < digits);
        CHECK(separation(rotation(Frame::galactic, Frame::icrs) * galactic, icrs) < digits);
        CHECK(separation(rotation(Frame::galactic, Frame::ecliptic) * galactic, ecliptic) <
              digits);
        CHECK(separation(rotation(Frame::ecliptic, Frame::icrs) * ecliptic, icrs) < digits);
        CHECK(separation(rotation(Frame::ecliptic, Frame::galactic) * ecliptic, galactic) <
              digits);
    }
}

TEST_CASE("the ecliptic is tilted by the IAU 2006 obliquity and includes the frame bias",
          "[sky]") {
    // eraObl06 at J2000 = 84381.406 arcsec (Capitaine et al. 2003 as used by IAU 2006); the
    // bias moves the pole by less than 0.02 arcsec.
    const Direction pole = rotation(Frame::ecliptic, Frame::icrs) * Direction::UnitZ();
    const double obliquity = separation(pole, Direction::UnitZ()) / degree * 3600.0;
    CHECK(std::abs(obliquity - 84381.406) < 0.02);
    CHECK(std::abs(obliquity - 84381.406) > 1e-4);
}

TEST_CASE("rotations are rotations, and identity is exact", "[sky]") {
    for (const Frame from : {Frame::galactic, Frame::icrs, Frame::ecliptic}) {
        CHECK(rotation(from, from) == Eigen::Matrix3d::Identity());
        for (const Frame to : {Frame::galactic, Frame::icrs, Frame::ecliptic}) {
            const Eigen::Matrix3d r = rotation(from, to);
            CHECK(largest(r * r.transpose() - Eigen::Matrix3d::Identity()) < 1e-15);
            CHECK(std::abs(r.determinant() - 1.0) < 1e-15);
            CHECK(largest(rotation(to, from) - r.transpose()) < 1e-16);
        }
    }
}

TEST_CASE("rotations agree with ERFA's own routines on random directions", "[sky]") {
    // Bound 2e-15: angles of up to 2 pi are known to 9e-16 on either side.
    Stream stream(103, Purpose::test, 0, 0, 0);
    double lon = 0.0;
    double lat = 0.0;
    // The yardstick first: t_eqec06 of the SOFA/ERFA test program (digits from memory).
    eraEqec06(1234.5, 2440000.5, 1.234, 0.987, &lon, &lat);
    REQUIRE(std::abs(lon - 1.342509918994654926) < 1e-14);
    REQUIRE(std::abs(lat - 0.5926215259704608132) < 1e-14);
    const Eigen::Matrix3d to_galactic = rotation(Frame::icrs, Frame::galactic);
    const Eigen::Matrix3d to_ecliptic = rotation(Frame::icrs, Frame::ecliptic);
    for (int draw = 0; draw < 2000; ++draw) {
        const double ra = 2.0 * 180.0 * degree * uniform(stream);
        const double dec = std::asin(2.0 * uniform(stream) - 1.0);
        eraIcrs2g(ra, dec, &lon, &lat);
        REQUIRE((to_galactic * from_radians(ra, dec) - from_radians(lon, lat)).norm() < 2e-15);
        eraEqec06(2451545.0, 0.0, ra, dec, &lon, &lat);
        REQUIRE((to_ecliptic * from_radians(ra, dec) - from_radians(lon, lat)).norm() < 2e-15);
    }
}
