// SPDX-License-Identifier: GPL-2.0-or-later
// Bins whose counts come as HEALPix maps.
#include <catch2/catch.hpp>
#include <numeric>

#include "small_survey.h"

using namespace deviascope;
using test::full_sky;
using test::missing;
using test::removed;
using test::SmallSurvey;

namespace {

/// A survey with one bin that is given as a map of these counts.
void add_map_bin(SmallSurvey& survey,
                 const std::vector<double>& count,
                 std::optional<Frame> frame = Frame::icrs) {
    survey.add_bin("mapped");
    survey.input.bins.back().counts = survey.add_map("counts.fits", count, frame);
}

std::vector<double> ascending(std::size_t n) {
    std::vector<double> count(n);
    std::iota(count.begin(), count.end(), 0.0);
    return count;
}

}  // namespace

TEST_CASE("a count map of the job's nside is taken as it is", "[counts]") {
    SmallSurvey survey;
    add_map_bin(survey, ascending(12));
    const SurveyCounts counts = survey.count(1);
    std::vector<std::uint32_t> expected(12);
    std::iota(expected.begin(), expected.end(), 0U);
    CHECK(full_sky(counts, 0, 12) == expected);
    CHECK(counts.cuts.rows_read == 66);
    CHECK(counts.cuts.rows_kept == 66);
}

TEST_CASE("a finer count map is summed", "[counts]") {
    SmallSurvey survey;
    const std::vector<double> fine = ascending(192);
    add_map_bin(survey, fine);
    const std::vector<std::uint32_t> got = full_sky(survey.count(1), 0, 12);
    for (std::int64_t pixel = 0; pixel < 12; ++pixel) {
        double sum = 0.0;
        for (const std::int64_t child : Pixelisation(1).children(pixel, Pixelisation(4)))
            sum += fine[static_cast<std::size_t>(child)];
        CHECK(got[static_cast<std::size_t>(pixel)] == sum);
    }
}

TEST_CASE("sources of a count map meet exclusions and exposure and enter the table",
          "[counts]") {
    SmallSurvey survey;
    survey.add_catalogue("a.csv", "45,41,1,0\n0,0,1,0\n");
    add_map_bin(survey, std::vector<double>(48, 1.0));
    survey.add_bin("read", {{"flux", 0.0, 2.0}});
    survey.input.exclude = {{BandExclusion{10.0}, Frame::icrs}};
    std::vector<double> exposure(48, 1.0);
    const std::vector<std::int64_t> children = Pixelisation(1).children(1, Pixelisation(2));
    exposure[static_cast<std::size_t>(children[2])] = 0.0;
    survey.input.exposure = survey.add_map("exposure.fits", exposure);
    const SurveyCounts counts = survey.count(1);
    CHECK(full_sky(counts, 0, 12) ==
          std::vector<std::uint32_t>{4, 3, 4, 4, 0, 0, 0, 0, 4, 4, 4, 4});
    CHECK(removed(counts, "exclude band 10 deg icrs").first == 17);
    CHECK(removed(counts, "exposure 0 at the source, in a kept pixel").first == 1);
    CHECK(counts.bins[1].total() == 1);
    CHECK(counts.cuts.rows_read == 50);
}

TEST_CASE("a count map coarser than its exposure is judged at its centres, with a warning",
          "[counts]") {
    SmallSurvey survey;
    add_map_bin(survey, std::vector<double>(12, 1.0));
    survey.input.exposure = survey.add_map("exposure.fits", std::vector<double>(48, 1.0));
    const SurveyCounts counts = survey.count(1);
    CHECK(counts.bins[0].total() == 12);
    REQUIRE(counts.cuts.warnings.size() == 1);
    CHECK_THAT(counts.cuts.warnings[0], Catch::Contains("bin mapped: its exposure is finer"));
}

TEST_CASE("count maps that do not fit are refused", "[counts]") {
    SmallSurvey survey;
    SECTION("coarser than the job") {
        add_map_bin(survey, std::vector<double>(12, 1.0));
        CHECK_THAT(survey.refusal(2), Catch::Contains("the count map has nside 1; at least"));
    }
    SECTION("in another frame") {
        add_map_bin(survey, std::vector<double>(12, 1.0), Frame::galactic);
        CHECK_THAT(survey.refusal(1),
                   Catch::Contains("the count map is in the galactic frame"));
    }
    SECTION("in no frame") {
        add_map_bin(survey, std::vector<double>(12, 1.0), {});
        CHECK_THAT(survey.refusal(1), Catch::Contains("no COORDSYS"));
    }
    std::vector<double> count(12, 1.0);
    SECTION("a fraction of a source") {
        count[3] = 1.5;
        add_map_bin(survey, count);
        CHECK_THAT(survey.refusal(1), Catch::Contains("pixel 3 (RING): the count is 1.5"));
    }
    SECTION("less than none") {
        count[3] = -1.0;
        add_map_bin(survey, count);
        CHECK_THAT(survey.refusal(1), Catch::Contains("pixel 3 (RING): the count is -1"));
    }
    SECTION("no count where the bin is exposed") {
        count[3] = missing;
        add_map_bin(survey, count);
        CHECK_THAT(survey.refusal(1), Catch::Contains("pixel 3 (RING): there is no count"));
    }
    SECTION("no count where nothing is exposed is fine") {
        count[4] = missing;
        add_map_bin(survey, count);
        survey.input.exclude = {{BandExclusion{10.0}, Frame::icrs}};
        CHECK(survey.count(1).bins[0].total() == 8);
    }
    SECTION("more sources in a pixel than can be counted") {
        count[3] = 4294967295.0;  // 2^32 - 1
        add_map_bin(survey, count);
        CHECK(survey.count(1).bins[0].total() == 4294967295 + 11);
        count[3] = 4294967296.0;
        survey.input.bins[0].counts = survey.add_map("more.fits", count);
        CHECK_THAT(survey.refusal(1),
                   Catch::Contains("bin mapped: pixel 3: there are more than 4294967295"));
    }
}

TEST_CASE("a catalogue that no bin selects from is not read, and this is said", "[counts]") {
    SmallSurvey survey;
    survey.add_catalogue("a.csv", "not,a,number,0\n");
    add_map_bin(survey, std::vector<double>(12, 1.0));
    const SurveyCounts counts = survey.count(1);
    CHECK(counts.cuts.rows_read == 12);
    REQUIRE(counts.cuts.warnings.size() == 1);
    CHECK_THAT(counts.cuts.warnings[0], Catch::Contains("the catalogue is not read"));
}
