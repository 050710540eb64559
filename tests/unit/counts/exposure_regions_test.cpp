// SPDX-License-Identifier: GPL-2.0-or-later
// Exposure given as a MOC: inside 1, outside 0.
#include <fmt/format.h>

#include <catch2/catch.hpp>
#include <cmath>

#include "core/fits/fits_file.h"
#include "deviascope/core/random.h"
#include "deviascope/sky/moc.h"
#include "small_survey.h"

using namespace deviascope;
using test::full_sky;
using test::removed;
using test::SmallSurvey;

namespace {

/// A third of the pixels of that order, drawn at random.
Moc random_region(int order, std::uint64_t seed) {
    Stream stream(seed, Purpose::test, 0, 0, 0);
    const int shift = 2 * (Moc::deepest_order - order);
    std::vector<Moc::Range> ranges;
    for (std::int64_t pixel = 0; pixel < std::int64_t{12} << 2 * order; ++pixel)
        if (uniform(stream) < 1.0 / 3.0)
            ranges.push_back({pixel << shift, (pixel + 1) << shift});
    return Moc(ranges);
}

/// The same region as a map of 0 and 1.
std::vector<double> map_of(const Moc& region, int order) {
    const Pixelisation grid(1 << order);
    std::vector<double> value;
    for (std::int64_t pixel = 0; pixel < grid.n_pixels(); ++pixel)
        value.push_back(region.share_of(grid.nested_of_ring(pixel), order));
    return value;
}

std::string random_rows(int n) {
    Stream stream(311, Purpose::test, 1, 0, 0);
    std::string rows;
    for (int row = 0; row < n; ++row) {
        const double lon = 360.0 * uniform(stream);
        const double z = 2.0 * uniform(stream) - 1.0;
        rows += fmt::format("{},{},1,0\n", lon, std::asin(z) * 57.29577951308232);
    }
    return rows;
}

void check_alike(const SurveyCounts& a, const SurveyCounts& b) {
    REQUIRE(a.footprints.size() == b.footprints.size());
    for (std::size_t i = 0; i < a.footprints.size(); ++i) {
        CHECK(a.footprints[i].pixel == b.footprints[i].pixel);
        CHECK(a.footprints[i].exposure == b.footprints[i].exposure);
    }
    for (std::size_t bin = 0; bin < a.bins.size(); ++bin)
        CHECK(a.bins[bin].count == b.bins[bin].count);
    CHECK(a.cuts.rows_kept == b.cuts.rows_kept);
}

}  // namespace

TEST_CASE("a MOC as exposure counts as its map of 0 and 1 does, in every frame", "[counts]") {
    const int order = GENERATE(1, 3, 5);
    const Frame frame = GENERATE(Frame::icrs, Frame::galactic);
    SmallSurvey survey;
    survey.add_catalogue("a.csv", random_rows(5000));
    survey.add_bin("all");
    survey.add_bin("none", {{"flux", 2.0, 3.0}});
    survey.input.bins[0].select = {{"flux", 0.0, 2.0}};
    const Moc region = random_region(order, 312);
    write_moc(survey.folder / "region.moc.fits", region);

    SECTION("of the survey") {
        survey.input.exposure = survey.folder / "region.moc.fits";
        const SurveyCounts by_moc = survey.count(8, frame);
        survey.input.exposure = survey.add_map("region.fits", map_of(region, order));
        check_alike(by_moc, survey.count(8, frame));
        CHECK(by_moc.bins[0].total() > 1000);
    }
    SECTION("of a bin, under a map of the survey") {
        std::vector<double> half(12 * 16 * 16);
        for (std::size_t pixel = 0; pixel < half.size(); ++pixel)
            half[pixel] = pixel % 3 == 0 ? 0.0 : 0.5;
        survey.input.exposure = survey.add_map("half.fits", half);
        survey.input.bins[0].exposure = survey.folder / "region.moc.fits";
        const SurveyCounts by_moc = survey.count(8, frame);
        survey.input.bins[0].exposure = survey.add_map("region.fits", map_of(region, order));
        check_alike(by_moc, survey.count(8, frame));
    }
}

TEST_CASE("a MOC much finer than the grid counts by its share of each pixel", "[counts]") {
    SmallSurvey survey;
    // Of base pixel 4 (round lon 0, lat 0): its first quarter and one pixel of order 29.
    const std::int64_t base = std::int64_t{4} << 58;
    write_moc(survey.folder / "fine.moc.fits",
              Moc({{base, base + (std::int64_t{1} << 56)},
                   {base + (3LL << 56), base + (3LL << 56) + 1}}));
    survey.input.exposure = survey.folder / "fine.moc.fits";
    survey.add_catalogue("a.csv", "0,-30,1,0\n0,30,1,0\n90,0,1,0\n");
    survey.add_bin("all");
    const SurveyCounts counts = survey.count(1);
    REQUIRE(counts.footprints[0].pixel == std::vector<std::int64_t>{4});
    CHECK(counts.footprints[0].exposure[0] == std::ldexp(1.0, -2) + std::ldexp(1.0, -58));
    CHECK(counts.bins[0].total() == 1);
    CHECK(removed(counts, "exposure 0 at the source, in a kept pixel").first == 1);
    CHECK(removed(counts, "exposure 0").first == 1);
}

TEST_CASE("a MOC without COORDSYS is in ICRS, with map_frame in that, and both must agree",
          "[counts]") {
    SmallSurvey survey;
    fits::TableWriter writer(survey.folder / "a.fits", "MOC", {{"UNIQ", "K", ""}});
    writer.card("ORDERING", std::string("NUNIQ"), "");
    writer.write(0, 0, std::vector<std::int64_t>{4 + 4});
    writer.close();
    survey.input.exposure = survey.folder / "a.fits";
    survey.add_catalogue("a.csv", "0,0,1,0\n");
    survey.add_bin("all");
    CHECK(survey.count(1).footprints[0].pixel == std::vector<std::int64_t>{4});
    survey.input.map_frame = Frame::galactic;
    CHECK(survey.count(1, Frame::galactic).footprints[0].pixel == std::vector<std::int64_t>{4});
    write_moc(survey.folder / "a.fits", Moc({{0, 1LL << 58}}));
    CHECK_THAT(survey.refusal(1),
               Catch::Contains("COORDSYS says icrs, map_frame says galactic"));
    survey.input.map_frame.reset();
    survey.input.bins[0].counts = survey.folder / "a.fits";
    CHECK_THAT(survey.refusal(1), Catch::Contains("this is a MOC; a HEALPix map of numbers"));
    write_moc(survey.folder / "a.fits", Moc());
    CHECK_THAT(survey.refusal(1), Catch::Contains("no pixel is left"));
}
