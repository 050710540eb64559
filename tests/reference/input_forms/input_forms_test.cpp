// SPDX-License-Identifier: GPL-2.0-or-later
#include <catch2/catch.hpp>
#include <fstream>
#include <limits>
#include <sstream>
#include <string>

#include "deviascope/counts/count_maps.h"
#include "deviascope/counts/count_sources.h"
#include "deviascope/counts/counts_file.h"
#include "python_check.h"
#include "temporary_folder.h"

using namespace deviascope;

namespace {

const std::filesystem::path scripts =
    std::filesystem::path(DEVIASCOPE_TEST_DATA) / "reference" / "input_forms";
constexpr int nside = 32;

SurveyInput survey_without_bins() {
    SurveyInput survey;
    survey.name = "dunlin";
    survey.columns = {{"lon", "RA"}, {"lat", "DEC"}, {"flux", "S"}};
    survey.exclude = {{BelowExclusion{-35.0}, Frame::icrs}};
    return survey;
}

SurveyCounts counted(const SurveyInput& survey) {
    return count_survey(survey, Pixelisation(nside), Frame::icrs, {});
}

SurveyCounts count_of_table(const std::filesystem::path& path, const std::string& table) {
    SurveyInput survey = survey_without_bins();
    survey.catalogue = {path};
    if (!table.empty()) survey.table = table;
    survey.bins = {
        {"bright", {{"flux", 15.0, std::numeric_limits<double>::infinity()}}, {}, {}}};
    return counted(survey);
}

SurveyCounts count_of_map(const std::filesystem::path& path) {
    SurveyInput survey = survey_without_bins();
    survey.bins = {{"bright", {}, path, {}}};
    return counted(survey);
}

bool same_counts(const SurveyCounts& a, const SurveyCounts& b) {
    return a.footprints[0].pixel == b.footprints[0].pixel &&
           a.footprints[0].exposure == b.footprints[0].exposure &&
           a.bins[0].count == b.bins[0].count;
}

}  // namespace

TEST_CASE("the same sources give the same counts in every form of input", "[counts]") {
    const test::TemporaryFolder folder;
    const auto made = test::run_python(scripts / "write_forms.py", {folder.path().string()});
    INFO(made.output);
    REQUIRE(made.exit_code == 0);
    const SurveyCounts first = count_of_table(folder / "table.fits", "");
    REQUIRE(first.bins[0].total() > 20000);

    int n_forms = 0;
    std::string line, name, table;
    for (std::ifstream tables(folder / "tables"); std::getline(tables, line); ++n_forms) {
        std::istringstream words(line);
        table.clear();
        words >> name >> table;
        INFO(name);
        CHECK(same_counts(count_of_table(folder / name, table), first));
    }
    CHECK(n_forms == 6);
    for (std::ifstream maps(folder / "map-list"); std::getline(maps, name); ++n_forms) {
        INFO(name);
        CHECK(same_counts(count_of_map(folder / name), first));
    }
    CHECK(n_forms == 6 + 30);

    // Our own maps: read by healpy, and by the program as a count map and an exposure map.
    const Counts counts{nside, Frame::icrs, {first}};
    write_counts(folder / "counts.h5", {counts, "", ""});
    write_count_maps(counts, folder / "maps");
    const auto read = test::run_python(scripts / "read_maps.py",
                                       {folder.path().string(), "dunlin", "bright", "32"});
    INFO(read.output);
    CHECK(read.exit_code == 0);
    SurveyInput again;
    again.name = "dunlin";
    again.exposure = folder / "maps/dunlin/bright-exposure.fits";
    again.bins = {{"bright", {}, folder / "maps/dunlin/bright-counts.fits", {}}};
    CHECK(same_counts(counted(again), first));
}
