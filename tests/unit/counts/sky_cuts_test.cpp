// SPDX-License-Identifier: GPL-2.0-or-later
// Exclusions and exposure maps.
#include <catch2/catch.hpp>
#include <cmath>

#include "deviascope/core/physical_constants.h"
#include "small_survey.h"

using namespace deviascope;
using test::full_sky;
using test::missing;
using test::removed;
using test::SmallSurvey;

namespace {

const Footprint& footprint_of(const SurveyCounts& counts, std::size_t bin) {
    return counts.footprints[counts.bins[bin].footprint];
}

}  // namespace

TEST_CASE("a band whose edge is a ring of pixels keeps that ring", "[counts]") {
    // Kept pixels of nside 64 for |lat| >= 20 and 30 deg: healpy 1.16.1, pixel centres;
    // sin 30 deg = 0.5 is the z of a ring (Gorski et al. 2005, eq. 8: z = 4/3 - 2 i/(3 nside)).
    SmallSurvey survey;
    survey.add_catalogue("a.csv", "0,0,1,0\n");
    survey.add_bin("all");
    survey.input.exclude = {{BandExclusion{30.0}, Frame::icrs}};
    const SurveyCounts counts = survey.count(64);
    CHECK(counts.cuts.pixels_kept == 24832);
    CHECK(removed(counts, "exclude band 30 deg icrs") ==
          std::pair<std::int64_t, std::int64_t>{1, 24320});
    survey.input.exclude = {{BandExclusion{20.0}, Frame::icrs}};
    CHECK(survey.count(64).cuts.pixels_kept == 32512);
    survey.input.exclude = {{BelowExclusion{-30.0}, Frame::icrs},
                            {AboveExclusion{30.0}, Frame::icrs}};
    // All pixels, less those the band of 30 deg keeps, plus the two rings of 256 on the edges.
    CHECK(survey.count(64).cuts.pixels_kept == 49152 - 24832 + 512);
}

TEST_CASE("a source is judged by its pixel, not by its own position", "[counts]") {
    SmallSurvey survey;
    // nside 1: pixel 4 reaches to |lat| 41.8; its centre lies in the band of 10 deg.
    survey.add_catalogue("a.csv", "0,30,1,0\n45,10,1,0\n");
    survey.add_bin("all");
    survey.input.exclude = {{BandExclusion{10.0}, Frame::icrs}};
    const Pixelisation grid(1);
    REQUIRE(grid.pixel_at(direction_of(0.0, 30.0)) == 4);
    REQUIRE(grid.pixel_at(direction_of(45.0, 10.0)) == 0);
    const SurveyCounts counts = survey.count(1);
    CHECK(full_sky(counts, 0, 12)[0] == 1);
    CHECK(counts.cuts.rows_kept == 1);
}

TEST_CASE("a disc smaller than a pixel removes nothing and is warned of", "[counts]") {
    SmallSurvey survey;
    survey.add_catalogue("a.csv", "10,10,1,0\n");
    survey.add_bin("all");
    survey.input.exclude = {{DiscExclusion{10.0, 10.0, 0.01}, Frame::icrs},
                            {DiscExclusion{200.0, -40.0, 20.0}, Frame::icrs}};
    const SurveyCounts counts = survey.count(8);
    CHECK(removed(counts, "exclude lon 10 lat 10 radius 0.01 deg icrs") ==
          std::pair<std::int64_t, std::int64_t>{0, 0});
    CHECK(counts.cuts.pixels_kept < 768);
    CHECK(counts.cuts.rows_kept == 1);
    REQUIRE(counts.cuts.warnings.size() == 1);
    CHECK_THAT(
        counts.cuts.warnings[0],
        Catch::StartsWith("exclude lon 10 lat 10 radius 0.01 deg icrs removes no pixel") &&
            Catch::Contains("7.33 deg wide"));
}

TEST_CASE("what an earlier exclusion removed is not counted again", "[counts]") {
    SmallSurvey survey;
    survey.add_catalogue("a.csv", "0,0,1,0\n");
    survey.add_bin("all");
    survey.input.exclude = {{BandExclusion{10.0}, Frame::icrs},
                            {DiscExclusion{0.0, 0.0, 5.0}, Frame::icrs}};
    const SurveyCounts counts = survey.count(1);
    CHECK(removed(counts, "exclude band 10 deg icrs") ==
          std::pair<std::int64_t, std::int64_t>{1, 4});
    CHECK(removed(counts, "exclude lon 0 lat 0 radius 5 deg icrs") ==
          std::pair<std::int64_t, std::int64_t>{0, 0});
    CHECK(counts.cuts.warnings.size() == 1);
}

TEST_CASE("a finer exposure map gives its mean and drops sources in its holes", "[counts]") {
    SmallSurvey survey;
    survey.add_catalogue("a.csv", "2,0,1,0\n-2,0,1,0\n180,0,1,0\n");
    survey.add_bin("all");
    const Pixelisation grid(1);
    const Pixelisation fine(8);
    std::vector<double> map(768, 0.5);
    const auto hole = static_cast<std::size_t>(fine.pixel_at(direction_of(2.0, 0.0)));
    REQUIRE(fine.pixel_at(direction_of(-2.0, 0.0)) != static_cast<std::int64_t>(hole));
    SECTION("0") {
        map[hole] = 0.0;
    }
    SECTION("missing") {
        map[hole] = missing;
    }
    for (const std::int64_t pixel : grid.children(9, fine))
        map[static_cast<std::size_t>(pixel)] = missing;
    survey.input.exposure = survey.add_map("map.fits", map);
    const SurveyCounts counts = survey.count(1);
    const Footprint& footprint = footprint_of(counts, 0);
    REQUIRE(footprint.pixel == std::vector<std::int64_t>{0, 1, 2, 3, 4, 5, 6, 7, 8, 10, 11});
    CHECK(footprint.exposure[4] == 0.5 * 63.0 / 64.0);  // dyadic numbers: exact in any order
    CHECK(footprint.exposure[5] == 0.5);
    CHECK(full_sky(counts, 0, 12)[4] == 1);
    CHECK(removed(counts, "exposure 0 at the source, in a kept pixel").first == 1);
    CHECK(removed(counts, "exposure 0").second == 1);
    CHECK(footprint.exposed_solid_angle(grid) ==
          Approx(4.0 * 3.14159265358979323846 / 12.0 * (10 * 0.5 + 0.5 * 63.0 / 64.0))
              .epsilon(1e-15));
}

TEST_CASE("a coarser exposure map is repeated", "[counts]") {
    SmallSurvey survey;
    survey.add_catalogue("a.csv", "0,0,1,0\n90,0,1,0\n");
    survey.add_bin("all");
    std::vector<double> map(12, 0.0);
    map[4] = 0.25;
    map[0] = 1.0;
    survey.input.exposure = survey.add_map("map.fits", map);
    const SurveyCounts counts = survey.count(4);
    const Footprint& footprint = footprint_of(counts, 0);
    REQUIRE(footprint.pixel.size() == 32);
    const Pixelisation grid(4);
    for (std::size_t i = 0; i < footprint.pixel.size(); ++i) {
        const std::int64_t coarse = grid.parent(footprint.pixel[i], Pixelisation(1));
        CHECK(footprint.exposure[i] == map[static_cast<std::size_t>(coarse)]);
    }
    CHECK(removed(counts, "exposure 0") == std::pair<std::int64_t, std::int64_t>{1, 160});
}

TEST_CASE("an exposure map in another frame is averaged over 16 sub-pixels", "[counts]") {
    SmallSurvey survey;
    // The galactic north in a map that is galactic, for a job in ICRS.
    const Pixelisation cells(16);
    std::vector<double> map;
    for (const Direction& centre : cells.centres()) map.push_back(centre.z() > 0.0 ? 1.0 : 0.0);
    survey.input.exposure = survey.add_map("north.fits", map, Frame::galactic);
    survey.add_catalogue("a.csv", "192.9,27.1,1,0\n12.9,-27.1,1,0\n");  // the galactic poles
    survey.add_bin("all");
    const int nside = 4;
    const SurveyCounts counts = survey.count(nside);
    CHECK(counts.cuts.rows_kept == 1);
    CHECK(removed(counts, "exposure 0").first == 1);
    const Footprint& footprint = footprint_of(counts, 0);
    bool partial = false;
    const Eigen::Matrix3d to_galactic = rotation(Frame::icrs, Frame::galactic);
    for (std::size_t i = 0; i < footprint.pixel.size(); ++i) {
        const Pixelisation grid(nside);
        double sum = 0.0;
        for (const std::int64_t cell : grid.children(footprint.pixel[i], cells)) {
            const Direction centre = to_galactic * cells.centre(cell);
            sum += map[static_cast<std::size_t>(cells.pixel_at(centre))];
        }
        CHECK(footprint.exposure[i] == sum / 16.0);
        partial = partial || footprint.exposure[i] < 1.0;
    }
    CHECK(partial);
    // The map's own area: its half without the ring of 64 pixels on its equator. 192 sampled
    // pixels, some 24 of them cut, each known to about 1/16: below 0.5 %.
    const double area = 4.0 * 3.14159265358979323846 * (3072.0 - 64.0) / 2.0 / 3072.0;
    CHECK(footprint.exposed_solid_angle(Pixelisation(nside)) == Approx(area).epsilon(0.005));
}

TEST_CASE(
    "in a pixel cut by the edge of a map in another frame, sources are judged where they "
    "are",
    "[counts]") {
    SmallSurvey survey;
    const Pixelisation cells(4);
    std::vector<double> map;
    for (const Direction& centre : cells.centres()) map.push_back(centre.z() > 0.0 ? 1.0 : 0.0);
    survey.input.exposure = survey.add_map("north.fits", map, Frame::galactic);
    // Two sources of one ICRS pixel of nside 1, north and south of the galactic equator.
    survey.add_catalogue("a.csv", "130,0,1,0\n85,0,1,0\n");
    survey.add_bin("all");
    const Pixelisation grid(1);
    const auto at = [&](double lon_deg) { return direction_of(lon_deg, 0.0); };
    const Eigen::Matrix3d to_galactic = rotation(Frame::icrs, Frame::galactic);
    REQUIRE(grid.pixel_at(at(130.0)) == grid.pixel_at(at(85.0)));
    REQUIRE(map[static_cast<std::size_t>(cells.pixel_at(to_galactic * at(130.0)))] == 1.0);
    REQUIRE(map[static_cast<std::size_t>(cells.pixel_at(to_galactic * at(85.0)))] == 0.0);
    const SurveyCounts counts = survey.count(1);
    CHECK(counts.cuts.rows_kept == 1);
    CHECK(removed(counts, "exposure 0 at the source, in a kept pixel").first == 1);
}

TEST_CASE("a much finer map in another frame is warned of", "[counts]") {
    SmallSurvey survey;
    survey.add_catalogue("a.csv", "0,0,1,0\n");
    survey.add_bin("one", {{"flux", 0.0, 2.0}});
    survey.add_bin("two", {{"flux", 2.0, 3.0}});
    survey.input.exposure =
        survey.add_map("map.fits", std::vector<double>(768, 1.0), Frame::galactic);
    CHECK(survey.count(2).cuts.warnings.empty());
    const SurveyCounts counts = survey.count(1);
    REQUIRE(counts.cuts.warnings.size() == 1);
    CHECK_THAT(counts.cuts.warnings[0], Catch::Contains("read at 16 points"));
}

TEST_CASE("the frame of a map comes from COORDSYS or map_frame, never from both unlike",
          "[counts]") {
    SmallSurvey survey;
    survey.add_catalogue("a.csv", "192.9,27.1,1,0\n12.9,-27.1,1,0\n");
    survey.add_bin("all");
    std::vector<double> north(12, 0.0);
    for (std::size_t i = 0; i < 4; ++i) north[i] = 1.0;
    SECTION("neither") {
        survey.input.exposure = survey.add_map("map.fits", north, {});
        CHECK_THAT(survey.refusal(1), Catch::Contains("no COORDSYS"));
    }
    SECTION("map_frame alone") {
        survey.input.exposure = survey.add_map("map.fits", north, {});
        survey.input.map_frame = Frame::galactic;
        CHECK(survey.count(4).cuts.rows_kept == 1);
        CHECK(survey.count(1, Frame::galactic).cuts.pixels_kept == 4);
    }
    SECTION("both, alike") {
        survey.input.exposure = survey.add_map("map.fits", north, Frame::galactic);
        survey.input.map_frame = Frame::galactic;
        CHECK(survey.count(1, Frame::galactic).cuts.pixels_kept == 4);
    }
    SECTION("both, unlike") {
        survey.input.exposure = survey.add_map("map.fits", north, Frame::galactic);
        survey.input.map_frame = Frame::icrs;
        CHECK_THAT(survey.refusal(1),
                   Catch::Contains("COORDSYS says galactic, map_frame says icrs"));
    }
}

TEST_CASE("an exposure outside 0 to 1 is refused with its pixel and value", "[counts]") {
    SmallSurvey survey;
    survey.add_catalogue("a.csv", "0,0,1,0\n");
    survey.add_bin("all");
    const double value = GENERATE(1.0000000001, -0.25, test::infinity);
    std::vector<double> map(12, 1.0);
    map[7] = value;
    survey.input.exposure = survey.add_map("map.fits", map);
    CHECK_THAT(survey.refusal(1),
               Catch::Contains("map.fits: pixel 7 (RING): the exposure is ") &&
                   Catch::Contains("; 0 … 1;"));
}

TEST_CASE("bins with the same effective exposure share a footprint", "[counts]") {
    SmallSurvey survey;
    survey.add_catalogue("a.csv", "0,0,1,0\n0,0,2,0\n0,0,3,0\n90,0,3,0\n0,0,4,0\n");
    for (int bin = 1; bin <= 4; ++bin)
        survey.add_bin("b" + std::to_string(bin), {{"flux", double(bin), bin + 1.0}});
    std::vector<double> half(12, 0.5);
    half[5] = 0.0;
    survey.input.exposure = survey.add_map("survey.fits", std::vector<double>(12, 0.5));
    survey.input.bins[1].exposure = survey.add_map("ones.fits", std::vector<double>(12, 1.0));
    survey.input.bins[2].exposure = survey.add_map("half.fits", half);
    survey.input.bins[3].exposure = survey.add_map("half-again.fits", half);
    const SurveyCounts counts = survey.count(1);
    REQUIRE(counts.footprints.size() == 2);
    CHECK(counts.bins[0].footprint == counts.bins[1].footprint);
    CHECK(counts.bins[2].footprint == counts.bins[3].footprint);
    CHECK(footprint_of(counts, 2).exposure == std::vector<double>(11, 0.25));
    CHECK(removed(counts, "exposure of bin b3 0").first == 1);
    CHECK(counts.cuts.pixels_kept == 12);
    CHECK(counts.cuts.rows_kept == 4);
}

TEST_CASE("a hole of a bin's own exposure drops sources of that bin alone", "[counts]") {
    SmallSurvey survey;
    survey.add_catalogue("a.csv", "2,0,1,0\n2,0,5,0\n-2,0,5,0\n");
    survey.add_bin("faint", {{"flux", 0.0, 2.0}});
    survey.add_bin("bright", {{"flux", 2.0, 9.0}});
    const Pixelisation fine(8);
    std::vector<double> map(768, 1.0);
    map[static_cast<std::size_t>(fine.pixel_at(direction_of(2.0, 0.0)))] = 0.0;
    survey.input.bins[1].exposure = survey.add_map("bright.fits", map);
    const SurveyCounts counts = survey.count(1);
    CHECK(full_sky(counts, 0, 12)[4] == 1);
    CHECK(full_sky(counts, 1, 12)[4] == 1);
    CHECK(removed(counts, "exposure of bin bright 0").first == 1);
    CHECK(footprint_of(counts, 1).exposure[4] == 63.0 / 64.0);
}

TEST_CASE("holes that survey and bin share are not counted twice", "[counts]") {
    // The mean of the product, not the product of the means: half of pixel 4 is unobserved.
    SmallSurvey survey;
    survey.add_catalogue("a.csv", "0,0,1,0\n");
    survey.add_bin("all");
    const Pixelisation grid(1);
    const Pixelisation fine(2);
    std::vector<double> map(48, 1.0);
    const std::vector<std::int64_t> children = grid.children(4, fine);
    map[static_cast<std::size_t>(children[0])] = map[static_cast<std::size_t>(children[1])] = 0;
    survey.input.exposure = survey.add_map("survey.fits", map);
    survey.input.bins[0].exposure = survey.add_map("bin.fits", map);
    CHECK(footprint_of(survey.count(1), 0).exposure[4] == 0.5);
}

TEST_CASE("a survey or bin without any pixel is refused", "[counts]") {
    SmallSurvey survey;
    survey.add_catalogue("a.csv", "0,0,1,0\n");
    survey.add_bin("all");
    survey.input.exclude = {{BelowExclusion{0.0}, Frame::icrs},
                            {AboveExclusion{-1.0}, Frame::icrs}};
    CHECK_THAT(survey.refusal(1), Catch::Contains("survey dunlin, bin all: no pixel is left"));
}
