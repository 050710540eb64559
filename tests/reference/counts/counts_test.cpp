// SPDX-License-Identifier: GPL-2.0-or-later
#include <catch2/catch.hpp>
#include <cmath>
#include <fstream>
#include <limits>
#include <string>

#include "deviascope/counts/count_sources.h"
#include "python_check.h"
#include "temporary_folder.h"

using namespace deviascope;

namespace {

constexpr double infinity = std::numeric_limits<double>::infinity();

SurveyInput survey_of_script(const test::TemporaryFolder& folder, Frame catalogue_frame) {
    SurveyInput survey;
    survey.name = "dunlin";
    survey.catalogue = {folder / "dunlin-a.fits", folder / "dunlin-b.csv"};
    survey.frame = catalogue_frame;
    survey.columns = {{"lon", "LON"}, {"lat", "LAT"}, {"flux", "S"}, {"redshift", "Z"}};
    survey.exposure = folder / "exposure.fits";
    survey.exclude = {{BandExclusion{12.0}, Frame::galactic},
                      {DiscExclusion{83.6, 22.0, 6.0}, Frame::icrs},
                      {BelowExclusion{-40.0}, Frame::icrs}};
    survey.select = {{"flux", 12.0, infinity}};
    survey.bad_rows = BadRows::skip;
    survey.bins = {{"faint", {{"flux", 12.0, 20.0}, {"redshift", 0.5, 2.0}}, {}, {}},
                   {"mid", {{"flux", 20.0, 100.0}}, {}, {}},
                   {"bright", {{"flux", 100.0, infinity}, {"redshift", 0.0, 1.0}}, {}, {}}};
    return survey;
}

void check_pixels(const SurveyCounts& counts, const std::filesystem::path& expected) {
    REQUIRE(counts.footprints.size() == 1);
    const Footprint& footprint = counts.footprints[0];
    std::ifstream file(expected);
    std::size_t n = 0;
    std::int64_t n_wrong = 0;
    double worst_exposure = 0.0;
    std::int64_t pixel = 0;
    double exposure = 0.0;
    std::uint32_t count[3];
    while (file >> pixel >> exposure >> count[0] >> count[1] >> count[2]) {
        REQUIRE(n < footprint.pixel.size());
        n_wrong += footprint.pixel[n] != pixel;
        worst_exposure = std::max(worst_exposure, std::abs(footprint.exposure[n] - exposure));
        for (std::size_t bin = 0; bin < 3; ++bin)
            n_wrong += counts.bins[bin].count[n] != count[bin];
        ++n;
    }
    CHECK(n == footprint.pixel.size());
    CHECK(n > 4000);  // of 12288
    CHECK(n_wrong == 0);
    CHECK(worst_exposure < 1e-15);
}

void check_cuts(const CutReport& cuts, const std::filesystem::path& expected) {
    std::ifstream file(expected);
    std::vector<std::int64_t> removed;
    for (std::int64_t n = 0; file >> n;) removed.push_back(n);
    std::vector<std::int64_t> got;
    for (const CutLine& line : cuts.cuts) got.push_back(line.rows_removed);
    CHECK(got == removed);
    CHECK(cuts.rows_read == 100000);
}

}  // namespace

TEST_CASE("counts of a random catalogue agree with healpy in every frame", "[counts]") {
    struct Case {
        Frame job, catalogue;
        const char* seed;
    };
    const Case one = GENERATE(Case{Frame::galactic, Frame::icrs, "20260801"},
                              Case{Frame::icrs, Frame::ecliptic, "20260802"},
                              Case{Frame::ecliptic, Frame::galactic, "20260803"},
                              Case{Frame::icrs, Frame::icrs, "20260804"});
    const test::TemporaryFolder folder;
    const auto python = test::run_python(
        DEVIASCOPE_TEST_DATA "/reference/counts/count.py",
        {folder.path().string(), name_of(one.job), name_of(one.catalogue), one.seed});
    INFO(python.output);
    REQUIRE(python.exit_code == 0);
    const SurveyCounts counts =
        count_survey(survey_of_script(folder, one.catalogue), Pixelisation(32), one.job, {});
    check_pixels(counts, folder / "expected.txt");
    check_cuts(counts.cuts, folder / "cuts.txt");
}
