// SPDX-License-Identifier: GPL-2.0-or-later
// Rows of a catalogue: positions, selections, bins, the table of cuts.
// Pixels of nside 1 (Gorski et al. 2005, ApJ 622, 759, Fig. 4 and eqs. 2-9): 4, 5, 6, 7 are
// centred on the equator at lon 0, 90, 180, 270; 0 to 3 at lat +41.8, lon 45, 135, 225, 315;
// 8 to 11 at lat -41.8 likewise.
#include <fmt/format.h>

#include <algorithm>
#include <catch2/catch.hpp>
#include <numeric>

#include "core/fits/fits_file.h"
#include "deviascope/core/random.h"
#include "small_survey.h"

using namespace deviascope;
using test::full_sky;
using test::infinity;
using test::removed;
using test::SmallSurvey;

TEST_CASE("sources are counted in the pixels that hold them", "[counts]") {
    SmallSurvey survey;
    survey.add_catalogue("a.csv", "0,0,1,0\n1,1,1,0\n90,-2,1,0\n45,41,1,0\n225,-41,1,0\n");
    survey.add_bin("all");
    const SurveyCounts counts = survey.count(1);
    CHECK(full_sky(counts, 0, 12) ==
          std::vector<std::uint32_t>{1, 0, 0, 0, 2, 1, 0, 0, 0, 0, 1, 0});
    CHECK(counts.name == "dunlin");
    CHECK(counts.bins[0].name == "all");
    CHECK(counts.bins[0].total() == 5);
    CHECK(counts.footprints[0].sky_fraction(Pixelisation(1)) == 1.0);
    CHECK(counts.footprints[0].exposed_solid_angle(Pixelisation(1)) ==
          Approx(4.0 * 3.14159265358979323846).epsilon(1e-15));
    CHECK(counts.cuts.rows_read == 5);
    CHECK(counts.cuts.rows_kept == 5);
    CHECK(counts.cuts.pixels_kept == 12);
    CHECK(counts.cuts.warnings.empty());
}

TEST_CASE("longitudes run from -180 to 360, latitudes from -90 to 90, ends included",
          "[counts]") {
    SmallSurvey survey;
    survey.add_catalogue("a.csv", "-180,0,1,0\n360,0,1,0\n-90,0,1,0\n17,90,1,0\n17,-90,1,0\n");
    survey.add_bin("all");
    const std::vector<std::uint32_t> got = full_sky(survey.count(1), 0, 12);
    CHECK(got[6] == 1);
    CHECK(got[4] == 1);
    CHECK(got[7] == 1);
    CHECK(got[0] + got[1] + got[2] + got[3] == 1);
    CHECK(got[8] + got[9] + got[10] + got[11] == 1);
}

TEST_CASE("bad positions stop the run with their number and the first five", "[counts]") {
    SmallSurvey survey;
    survey.add_catalogue("a.csv", "0,0,1,0\n,0,1,0\n0,nan,1,0\n0,90.001,1,0\n");
    survey.add_catalogue("b.csv", "360.5,1,1,0\n-180.5,0,1,0\n1,inf,1,0\n2,-91,1,0\n3,3,1,0\n");
    survey.add_bin("none", {{"flux", 7.0, 8.0}});  // judged before any selection
    CHECK(survey.refusal(1) ==
          "survey dunlin: 7 rows have a position that is missing or out of range: "
          "a.csv line 3 (lon nan, lat 0), a.csv line 4 (lon 0, lat nan), "
          "a.csv line 5 (lon 0, lat 90.001), b.csv line 2 (lon 360.5, lat 1), "
          "b.csv line 3 (lon -180.5, lat 0), …; lon -180 … 360 and lat -90 … 90, in degrees; "
          "correct the rows, or set bad_rows = \"skip\" to leave them out");
    survey.input.bad_rows = BadRows::skip;
    const SurveyCounts counts = survey.count(1);
    CHECK(removed(counts, "position missing or out of range").first == 7);
    CHECK(counts.cuts.rows_read == 9);
}

TEST_CASE("ranges are half-open and several properties must all hold", "[counts]") {
    SmallSurvey survey;
    survey.add_catalogue("a.csv",
                         "0,0,10,0.5\n0,0,19.99,0.5\n0,0,20,0.5\n0,0,1e30,0.5\n0,0,9.99,0.5\n"
                         "0,0,15,1\n0,0,15,0\n0,0,inf,0.5\n0,0,-inf,0.5\n");
    survey.add_bin("faint", {{"flux", 10.0, 20.0}, {"redshift", 0.0, 1.0}});
    survey.add_bin("bright", {{"flux", 20.0, infinity}, {"redshift", 0.0, 1.0}});
    survey.add_bin("dim", {{"flux", -infinity, 0.0}});
    const SurveyCounts counts = survey.count(1);
    CHECK(counts.bins[0].total() == 3);
    CHECK(counts.bins[1].total() == 2);  // an infinite flux lies in no [20, inf)
    CHECK(counts.bins[2].total() == 1);
    CHECK(removed(counts, "in no bin").first == 3);
}

TEST_CASE("a missing value fails a selection and is counted as missing", "[counts]") {
    SmallSurvey survey;
    survey.add_catalogue("a.csv",
                         "0,0,,0.5\n0,0,15,\n0,0,5,\n0,0,15,0.5\n0,0,15,7\n0,0,,\n0,0,99,\n");
    survey.add_bin("near", {{"flux", 10.0, 50.0}, {"redshift", 0.0, 1.0}});
    SECTION("in the bins: where no other value fails") {
        const SurveyCounts counts = survey.count(1);
        CHECK(removed(counts, "flux missing").first == 2);
        CHECK(removed(counts, "redshift missing").first == 1);
        CHECK(removed(counts, "in no bin").first == 3);
        CHECK(counts.bins[0].total() == 1);
    }
    SECTION("in the survey's own selection, before the sky is looked at") {
        survey.input.select = {{"flux", 10.0, infinity}};
        const SurveyCounts counts = survey.count(1);
        CHECK(removed(counts, "select flux [10, inf)").first == 1);
        CHECK(removed(counts, "flux missing").first == 2);
        CHECK(removed(counts, "redshift missing").first == 1);
        CHECK(removed(counts, "in no bin").first == 2);
    }
}

TEST_CASE("a source in two bins stops the run with the number and the first five rows",
          "[counts]") {
    SmallSurvey survey;
    std::string rows = "0,0,1,0\n";
    for (int i = 0; i < 7; ++i) rows += "0,0,15,0\n";
    survey.add_catalogue("a.csv", rows);
    survey.add_bin("faint", {{"flux", 10.0, 20.0}});
    survey.add_bin("mid", {{"flux", 15.0, 25.0}});
    CHECK_THAT(survey.refusal(1),
               Catch::StartsWith("survey dunlin: 7 rows have a place in two bins: "
                                 "a.csv line 3 (faint and mid), a.csv line 4") &&
                   Catch::Contains("line 7 (faint and mid), …;") && !Catch::Contains("line 8"));
}

TEST_CASE("overlapping ranges are judged by actual sources", "[counts]") {
    SmallSurvey survey;
    survey.add_bin("faint", {{"flux", 10.0, 20.0}});
    survey.add_bin("mid", {{"flux", 15.0, 25.0}});
    SECTION("no source lies in the overlap") {
        survey.add_catalogue("a.csv", "0,0,12,0\n0,0,22,0\n");
        CHECK(survey.count(1).cuts.rows_kept == 2);
    }
    SECTION("a source in the overlap, where the sky is excluded") {
        survey.add_catalogue("a.csv", "0,0,12,0\n0,0,16,0\n45,41,22,0\n");
        survey.input.exclude = {{BandExclusion{5.0}, Frame::icrs}};
        CHECK(survey.count(1).cuts.rows_kept == 1);
    }
    SECTION("a source in the overlap, where one bin alone is exposed") {
        survey.add_catalogue("a.csv", "0,0,16,0\n90,0,16,0\n");
        std::vector<double> east(12, 0.0);
        std::vector<double> west(12, 1.0);
        east[5] = 1.0;
        west[5] = 0.0;
        survey.input.bins[0].exposure = survey.add_map("east.fits", east);
        survey.input.bins[1].exposure = survey.add_map("west.fits", west);
        const SurveyCounts counts = survey.count(1);
        CHECK(counts.bins[0].total() == 1);
        CHECK(counts.bins[1].total() == 1);
        CHECK(counts.footprints.size() == 2);
    }
}

TEST_CASE("the table of cuts holds every cut in its order and adds up", "[counts]") {
    SmallSurvey survey;
    // Of nside 1: the band removes 4 to 7, below -30 removes 8 to 11, the map pixel 0 and,
    // finer, a part of pixel 1.
    survey.add_catalogue("a.csv",
                         ",0,15,0\n"          // position
                         "0,0,1,0\n"          // survey's select, though in the band too
                         "0,0,,0\n"           // flux missing
                         "0,0,15,0\n"         // band
                         "45,-41,15,0\n"      // below
                         "45,41,15,0\n"       // exposure 0
                         "135,87,15,0\n"      // hole
                         "135,41,15,\n"       // redshift missing
                         "135,41,60,0\n"      // no bin
                         "135,41,15,0\n"      // kept
                         "225,41,15,0\n"      // kept
                         "225,41,35,0.5\n"    // exposure of bin far
                         "315,41,35,0.5\n");  // kept
    const Pixelisation grid(1);
    const Pixelisation fine(2);
    std::vector<double> map(48, 1.0);
    for (const std::int64_t pixel : grid.children(0, fine))
        map[static_cast<std::size_t>(pixel)] = 0.0;
    const std::int64_t hole = fine.pixel_at(direction_of(135.0, 87.0));
    REQUIRE(fine.parent(hole, grid) == 1);
    map[static_cast<std::size_t>(hole)] = 0.0;
    survey.input.exposure = survey.add_map("map.fits", map);
    std::vector<double> far(12, 1.0);
    far[2] = 0.0;
    survey.input.select = {{"flux", 10.0, infinity}};
    survey.input.exclude = {{BandExclusion{10.0}, Frame::icrs},
                            {BelowExclusion{-30.0}, Frame::icrs}};
    survey.input.bad_rows = BadRows::skip;
    survey.add_bin("near", {{"flux", 10.0, 30.0}, {"redshift", -1.0, 1.0}});
    survey.add_bin("far", {{"flux", 30.0, 50.0}});
    survey.input.bins[1].exposure = survey.add_map("far.fits", far);

    const SurveyCounts counts = survey.count(1);
    std::vector<std::string> got;
    for (const CutLine& line : counts.cuts.cuts)
        got.push_back(
            fmt::format("{}: {} {}", line.name, line.rows_removed, line.pixels_removed));
    CHECK(got == std::vector<std::string>{"position missing or out of range: 1 0",
                                          "flux missing: 1 0",
                                          "select flux [10, inf): 1 0",
                                          "exclude band 10 deg icrs: 1 4",
                                          "exclude below -30 deg icrs: 1 4",
                                          "exposure 0: 1 1",
                                          "exposure 0 at the source, in a kept pixel: 1 0",
                                          "redshift missing: 1 0",
                                          "in no bin: 1 0",
                                          "exposure of bin far 0: 1 0"});
    CHECK(counts.cuts.rows_read == 13);
    CHECK(counts.cuts.rows_kept == 3);
    CHECK(counts.cuts.pixels_total == 12);
    CHECK(counts.cuts.pixels_kept == 3);
    CHECK(counts.footprints[counts.bins[0].footprint].exposure ==
          std::vector<double>{0.75, 1.0, 1.0});
    CHECK(counts.footprints[counts.bins[1].footprint].pixel == std::vector<std::int64_t>{1, 3});
}

TEST_CASE("counts depend neither on the order of rows nor on the division into files",
          "[counts]") {
    const int n_rows = 3000;
    std::vector<std::string> rows;
    for (std::uint64_t i = 0; i < n_rows; ++i) {
        Stream stream(41, Purpose::test, i, 0, 0);
        const double lon = 360.0 * uniform(stream);
        const double lat = 180.0 * uniform(stream) - 90.0;
        const double flux = 30.0 * uniform(stream);
        rows.push_back(fmt::format("{},{},{},0\n", lon, lat, flux));
    }
    const auto counted = [&](std::size_t rows_of_first) {
        SmallSurvey survey;
        const auto joined = [&](std::size_t begin, std::size_t end) {
            std::string text;
            for (std::size_t i = begin; i < end; ++i) text += rows[i];
            return text;
        };
        survey.add_catalogue("a.csv", joined(0, rows_of_first));
        survey.add_catalogue("b.csv", joined(rows_of_first, rows.size()));
        survey.input.exclude = {{BandExclusion{15.0}, Frame::galactic}};
        survey.add_bin("faint", {{"flux", 5.0, 15.0}});
        survey.add_bin("bright", {{"flux", 15.0, 25.0}});
        return survey.count(8, Frame::galactic);
    };
    const SurveyCounts one = counted(1000);
    Stream stream(42, Purpose::test, 0, 0, 0);
    std::shuffle(rows.begin(), rows.end(), stream);
    const SurveyCounts other = counted(17);
    REQUIRE(one.bins[0].total() > 500);
    for (std::size_t bin = 0; bin < 2; ++bin)
        CHECK(one.bins[bin].count == other.bins[bin].count);
    for (std::size_t i = 0; i < one.cuts.cuts.size(); ++i)
        CHECK(one.cuts.cuts[i].rows_removed == other.cuts.cuts[i].rows_removed);
}

TEST_CASE("reading says how far it is, with the total where it is known", "[counts]") {
    SmallSurvey survey;
    std::string rows;
    for (int i = 0; i < 20000; ++i) rows += "0,0,1,0\n";
    survey.add_catalogue("a.csv", rows);
    survey.add_bin("all");
    std::vector<std::string> lines;
    const auto note = [&](const std::string& line) { lines.push_back(line); };
    count_survey(survey.input, Pixelisation(1), Frame::icrs, note);
    CHECK(lines.back() == "dunlin: 20 000 rows read");
    CHECK(lines.size() > 1);

    const auto path = survey.folder / "b.fits";
    fits::TableWriter file(path, "SOURCES", {{"RA", "D", "h"}, {"DEC", "D", "deg"}});
    file.write(0, 0, std::vector<double>(1234, 1.0));
    file.write(1, 0, std::vector<double>(1234, 1.0));
    file.close();
    survey.input.catalogue = {path, path};
    const SurveyCounts counts = count_survey(survey.input, Pixelisation(1), Frame::icrs, note);
    CHECK(lines.back() == "dunlin: 2 468 of 2 468 rows read");
    REQUIRE(counts.cuts.warnings.size() == 5);  // the unit of two files; all at one place
    CHECK_THAT(counts.cuts.warnings[0], Catch::Contains("column RA states the unit `h`"));
    CHECK_THAT(counts.cuts.warnings[1], Catch::Contains("column RA states the unit `h`"));
}

TEST_CASE("a fault of the last file shows before the first is read", "[counts]") {
    SmallSurvey survey;
    survey.add_catalogue("a.csv", "0,0,1,0\n");
    survey.input.catalogue.push_back(survey.folder.write("b.csv", "RA,DEX,S\n0,0,1\n"));
    survey.add_bin("all", {{"flux", 0.0, 2.0}});
    int n_lines = 0;
    CHECK_THROWS_WITH(
        count_survey(
            survey.input, Pixelisation(1), Frame::icrs, [&](const std::string&) { ++n_lines; }),
        Catch::Contains("b.csv: there is no column `DEC`"));
    CHECK(n_lines == 0);
}

TEST_CASE("a catalogue without rows is warned of", "[counts]") {
    SmallSurvey survey;
    survey.add_catalogue("a.csv", "");
    survey.add_bin("all");
    const SurveyCounts counts = survey.count(1);
    CHECK(counts.bins[0].total() == 0);
    REQUIRE(counts.cuts.warnings.size() == 1);
    CHECK_THAT(counts.cuts.warnings[0], Catch::Contains("a.csv: it has no rows"));
}
