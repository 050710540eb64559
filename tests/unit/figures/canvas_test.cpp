// SPDX-License-Identifier: GPL-2.0-or-later
#include <Eigen/Geometry>
#include <array>
#include <catch2/catch.hpp>
#include <cmath>
#include <numbers>

#include "deviascope/core/random.h"
#include "figures/axis.h"
#include "figures/backends.h"
#include "figures/contour.h"
#include "figures/mollweide.h"
#include "temporary_folder.h"

using namespace deviascope;

namespace {

using Linear = Eigen::Vector3d;

Linear linear_of(const Colour& colour) {
    const auto decode = [](double byte) {
        const double x = byte / 255.0;
        return x <= 0.04045 ? x / 12.92 : std::pow((x + 0.055) / 1.055, 2.4);
    };
    return {decode(colour.red), decode(colour.green), decode(colour.blue)};
}

/// OKLab of linear sRGB (Ottosson 2020; matrices from memory).
Linear oklab_of(const Linear& rgb) {
    Eigen::Matrix3d to_cones, to_lab;
    to_cones << 0.4122214708, 0.5363325363, 0.0514459929, 0.2119034982, 0.6806995451,
        0.1073969566, 0.0883024619, 0.2817188376, 0.6299787005;
    to_lab << 0.2104542553, 0.7936177850, -0.0040720468, 1.9779984951, -2.4285922050,
        0.4505937099, 0.0259040371, 0.7827717662, -0.8086757660;
    return to_lab * (to_cones * rgb).array().max(0.0).pow(1.0 / 3.0).matrix();
}

/// Severe deficiencies, from Machado, Oliveira & Fernandes 2009, IEEE Trans. Vis. Comput.
/// Graph. 15, 1291 (matrices from memory): protan, deutan, tritan.
std::array<Eigen::Matrix3d, 4> sights() {
    std::array<Eigen::Matrix3d, 4> all;
    all[0].setIdentity();
    all[1] << 0.152286, 1.052583, -0.204868, 0.114503, 0.786281, 0.099216, -0.003882, -0.048116,
        1.051998;
    all[2] << 0.367322, 0.860646, -0.227968, 0.280085, 0.672501, 0.047413, -0.011820, 0.042940,
        0.968881;
    all[3] << 1.255528, -0.076749, -0.178779, -0.078411, 0.930809, 0.147602, 0.004733, 0.691367,
        0.303900;
    return all;
}

}  // namespace

// oklch() of the sRGB primaries as CSS Color Module Level 4 gives them (from memory).
TEST_CASE("colours follow OKLCH", "[figures]") {
    CHECK(oklch(0.62796, 0.25768, 29.234).hex() == "#FF0000");
    CHECK(oklch(0.86644, 0.29483, 142.495).hex() == "#00FF00");
    CHECK(oklch(0.45201, 0.31321, 264.052).hex() == "#0000FF");
    CHECK(oklch(1.0, 0.0, 0.0).hex() == "#FFFFFF");
    CHECK(oklch(0.0, 0.0, 0.0).hex() == "#000000");
}

TEST_CASE("series stay apart for every kind of sight, and in grey", "[figures]") {
    for (const Eigen::Matrix3d& sight : sights())
        for (std::size_t a = 0; a < 4; ++a)
            for (std::size_t b = a + 1; b < 4; ++b) {
                const Linear first = oklab_of(sight * linear_of(palette::series(a)));
                const Linear second = oklab_of(sight * linear_of(palette::series(b)));
                INFO(a << " and " << b);
                CHECK((first - second).norm() > 0.15);
                // Printed in grey, lightness alone tells them apart.
                CHECK(std::abs(oklab_of(linear_of(palette::series(a)))[0] -
                               oklab_of(linear_of(palette::series(b)))[0]) > 0.08);
            }
}

TEST_CASE("text is readable on its ground, light and dark", "[figures]") {
    // WCAG 2.1, success criterion 1.4.3: contrast of at least 4.5 for text.
    const auto luminance = [](const Colour& colour) {
        return Eigen::Vector3d(0.2126, 0.7152, 0.0722).dot(linear_of(colour));
    };
    const auto contrast = [&](const Colour& a, const Colour& b) {
        const double high = std::max(luminance(a), luminance(b)) + 0.05;
        return high / (std::min(luminance(a), luminance(b)) + 0.05);
    };
    for (const Colour& ink : {palette::ink(), palette::grey_text(), palette::warning()})
        for (const Colour& ground : {palette::paper(), palette::tile(), palette::panel()}) {
            CHECK(contrast(ink, ground) > 4.5);
            CHECK(contrast(palette::on_dark(ink), palette::on_dark(ground)) > 4.5);
        }
}

TEST_CASE("Mollweide's map turns back, and keeps areas", "[figures]") {
    const Mollweide map(120.0);
    for (std::uint64_t number = 0; number < 2000; ++number) {
        Stream stream(20260817, Purpose::test, 90, number, 0);
        Eigen::Vector3d vector;
        for (Eigen::Index at = 0; at < 3; ++at) vector[at] = normal(stream);
        const Direction direction = vector.normalized();
        const Mollweide::Place place = map.project(direction);
        REQUIRE((*map.direction_at(place) - direction).norm() < 1e-8);
        // Area of a small quadrilateral: sphere 4 pi on an ellipse of area 2 pi.
        if (std::abs(direction.z()) > 0.98) continue;
        const double step = 1e-5;
        const Direction east = Direction(-direction.y(), direction.x(), 0.0).normalized();
        const Direction north = direction.cross(east);
        const auto moved = [&](const Direction& along) {
            return map.project((direction + step * along).normalized());
        };
        const auto a = moved(east), b = moved(north);
        if (std::abs(a.x - place.x) > 1.0) continue;  // across the seam
        const double area =
            (a.x - place.x) * (b.y - place.y) - (a.y - place.y) * (b.x - place.x);
        CHECK(std::abs(area) == Approx(0.5 * step * step).epsilon(2e-3));
    }
    for (const double lat : {90.0, -90.0, 89.9999}) {
        const Mollweide::Place place = map.project(direction_of(33.0, lat));
        CHECK(std::abs(place.x) < 0.01);
        CHECK(std::abs(place.y) == Approx(1.0).margin(1e-4));
    }
    CHECK_FALSE(map.direction_at({1.9, 0.5}).has_value());
    CHECK(map.project(direction_of(130.0, 0.0)).x < 0.0);  // longitudes grow to the left
}

TEST_CASE("level lines are closed, also at the edge, and hold the right area", "[figures]") {
    Eigen::ArrayXXd field(81, 81);
    const auto fill = [&](double x0, double y0) {
        for (Eigen::Index row = 0; row < 81; ++row)
            for (Eigen::Index column = 0; column < 81; ++column)
                field(row, column) = -std::hypot(double(column) - x0, double(row) - y0);
    };
    const auto area_of = [](const std::vector<Polyline>& lines) {
        double area = 0.0;
        for (const Polyline& line : lines)
            for (std::size_t at = 0; at < line.point.size(); ++at) {
                const Point& a = line.point[at];
                const Point& b = line.point[(at + 1) % line.point.size()];
                area += 0.5 * (a.x * b.y - b.x * a.y);
            }
        return std::abs(area);
    };
    fill(40.0, 41.0);
    const auto circle = level_lines(field, -20.0);
    REQUIRE(circle.size() == 1);
    CHECK(area_of(circle) == Approx(400.0 * std::numbers::pi).epsilon(2e-3));
    fill(0.0, 40.0);  // half of it on the field
    const auto half = level_lines(field, -20.0);
    REQUIRE(half.size() == 1);
    CHECK(area_of(half) == Approx(200.0 * std::numbers::pi).epsilon(5e-3));
    CHECK(level_lines(field, 1.0).empty());
    const auto all = level_lines(field, -1e3);
    REQUIRE(all.size() == 1);
    CHECK(area_of(all) == Approx(6400.0));
    // A ring has an inner line, turned the other way, so that areas subtract.
    fill(40.0, 40.0);
    const auto ring = level_lines(-(field + 20.0).abs(), -5.0);
    REQUIRE(ring.size() == 2);
    CHECK(area_of(ring) == Approx((625.0 - 225.0) * std::numbers::pi).epsilon(5e-3));
}

TEST_CASE("ticks are round, apart, and never minus zero", "[figures]") {
    const Fonts fonts;
    CHECK(plain_number(-0.001, 2) == "0.00");
    CHECK(plain_number(-1.5, 1) == "−1.5");
    for (const double length : {12.0, 30.0, 60.0, 200.0, 500.0})
        for (const auto& [lo, hi] : {std::pair{-3.0, 3.0},
                                     {-1e-9, 2e-9},
                                     {123456.0, 123999.0},
                                     {0.0, 370.0},
                                     {-0.07, 17.3},
                                     {1e12, 3e12}})
            for (const bool side_by_side : {true, false}) {
                const Scale scale{lo, hi, 0.0, length};
                const auto ticks = ticks_of(scale, fonts, side_by_side);
                double end = -1e9;
                for (const Tick& tick : ticks) {
                    CHECK(tick.value >= lo - 1e-9 * (hi - lo));
                    CHECK(tick.value <= hi + 1e-9 * (hi - lo));
                    CHECK(tick.label != "−0");
                    const double half = 0.5 * fonts.width(tick.label, type::tick);
                    if (side_by_side) CHECK(scale.at(tick.value) - half > end);
                    end = scale.at(tick.value) + half;
                }
                if (length >= 60.0) CHECK(ticks.size() >= 1);
            }
}

TEST_CASE("texts are measured, cut and cleaned", "[figures]") {
    const Fonts fonts;
    CHECK(fonts.width("mm", 10.0) == Approx(2.0 * fonts.width("m", 10.0)));
    CHECK(fonts.width("β", 10.0) > 3.0);
    CHECK(fonts.width("⁻³", 10.0) > 3.0);  // from the second font, if need be
    const std::string name(80, 'w');
    const std::string cut = shortened(fonts, name, 7.0, 100.0);
    CHECK(fonts.width(cut, 7.0) <= 100.0);
    CHECK_THAT(cut, Catch::Contains("…"));
    for (const std::string& line : wrapped(fonts, "one two " + name + " three", 7.0, 60.0))
        CHECK(fonts.width(line, 7.0) <= 60.0);
    CHECK(printable("a\nb\x01") == "a b ");
    CHECK(printable("caf\xC3\xA9 \xFF") == "caf\xC3\xA9 \xEF\xBF\xBD");
    CHECK(printable("\xED\xA0\x80x").find('x') != std::string::npos);  // half a surrogate pair
    CHECK(escaped("<a & \"b\">") == "&lt;a &amp; &quot;b&quot;&gt;");
}

TEST_CASE("a file that is no font is refused", "[figures]") {
    const test::TemporaryFolder folder;
    folder.write("letters.ttf", "no font");
    CHECK_THROWS_WITH(Fonts(folder / "letters.ttf"),
                      Catch::Contains("letters.ttf: is not a font"));
}

TEST_CASE("SVG numbers have two decimals and no minus zero; ids begin with the prefix",
          "[figures]") {
    const Fonts fonts;
    Drawing drawing{100.0, 50.0, {}};
    drawing.line({-0.001, 1.23456}, {2.5, 3.0}, {0.5, palette::ink()});
    drawing.add(Clip{Drawing::edge_of({0, 0, 10, 10}), {}});
    drawing.add(text_at({1.0, 2.0}, "a < b", 7.0));
    const std::string svg = to_svg(drawing, fonts, {"title", "words", "one-", false});
    CHECK_THAT(svg, Catch::Contains("d=\"M0 1.23L2.5 3\""));
    CHECK_THAT(svg, Catch::Contains("id=\"one-clip0\"") && Catch::Contains("a &lt; b"));
    CHECK_THAT(svg, Catch::Contains("<title id=\"one-title\">title</title>"));
    const std::string inlined = to_svg(drawing, fonts, {"title", "words", "two-", true});
    CHECK_THAT(inlined, Catch::Contains("stroke:var(--c1D202B,#1D202B)"));
    CHECK_THAT(inlined, !Catch::Contains("<?xml"));
    CHECK_THAT(to_pdf(drawing, fonts, "title"), Catch::StartsWith("%PDF-"));
}
