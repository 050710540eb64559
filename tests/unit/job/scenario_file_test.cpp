// SPDX-License-Identifier: GPL-2.0-or-later
#include "deviascope/job/scenario_file.h"

#include <catch2/catch.hpp>
#include <cmath>

#include "deviascope/core/error.h"
#include "temporary_folder.h"

using namespace deviascope;

namespace {

const std::string sound = R"([scenario]
title = "A small sky"
seed = 7
frame = "icrs"

[velocity]
speed_km_s = 299.792458
lon_deg = 0.0
lat_deg = 90.0

[[survey]]
name = "dunlin"
sources = 1000
intrinsic = { amplitude = 0.25, lon_deg = 90.0, lat_deg = 0.0 }
alpha = { mean = 0.8, sd = 0.2 }
flux = { kind = "broken-power-law", minimum = 1, break = 40.0, faint_slope = 0.7, bright_slope = 2.0 }
redshift = { scale = 0.9, power = 1.5 }
magnitude = { slope = 0.5, limit = 22.0 }
size = { median = 2.0, sd_ln = 0.6 }
scatter = { flux = 0.05, redshift = 0.02, magnitude = 0.1, size = 0.3 }
extra_components = 0.5
keep = { flux = [10.0, inf], size = [1.0, 2.0] }
exclude = [ { band = 10.0, frame = "galactic" }, { below = -40.0, frame = "icrs" } ]
exposure = { lowest = 0.6, lon_deg = 10.0, lat_deg = 20.0, frame = "ecliptic", nside = 16, file = "w.fits" }
file = "d.csv"
frame = "galactic"
columns = { lon = "L", lat = "B", flux = "S" }
precision = "single"
table = "ROWS"

[[survey]]
name = "lantern"
sources = 5
intrinsic = { vector = [0.1, 0.2, 0.3] }
flux = { kind = "double-power-law", minimum = 1.0, turn = 3.0, faint_slope = 0.7, bright_slope = 2.0 }
keep = { flux = [10.0, inf] }
columns = { lon = "RA", lat = "DEC" }
)";

std::string faults_of(const std::string& text) {
    try {
        parse_scenario(text, "sky.toml", ".");
    } catch (const UsageError& error) {
        return error.what();
    }
    return "";
}

std::string replaced(std::string text, const std::string& from, const std::string& to) {
    const std::size_t place = text.find(from);
    REQUIRE(place != std::string::npos);
    return text.replace(place, from.size(), to);
}

}  // namespace

TEST_CASE("every key of a scenario file is understood", "[job]") {
    const Scenario scenario = parse_scenario(sound, "sky.toml", ".");
    CHECK(scenario.title == "A small sky");
    CHECK(scenario.seed == 7);
    CHECK(scenario.frame == Frame::icrs);
    // 299.792458 km/s is c/1000, c = 299792.458 km/s exactly (BIPM 2019).
    CHECK((scenario.velocity - Eigen::Vector3d(0.0, 0.0, 1e-3)).norm() < 1e-18);
    REQUIRE(scenario.surveys.size() == 2);
    const MockSurvey& dunlin = scenario.surveys[0];
    CHECK(dunlin.sources == 1000.0);
    CHECK((dunlin.intrinsic - Eigen::Vector3d(0.0, 0.25, 0.0)).norm() < 1e-16);
    CHECK(dunlin.alpha.mean == 0.8);
    CHECK(dunlin.alpha.sd == 0.2);
    const auto& law = std::get<BrokenPowerLawFlux>(*dunlin.flux);
    CHECK(law.minimum == 1.0);
    CHECK(law.break_flux == 40.0);
    CHECK(law.faint_slope == 0.7);
    CHECK(law.bright_slope == 2.0);
    CHECK(dunlin.redshift->power == 1.5);
    CHECK(dunlin.magnitude->limit == 22.0);
    CHECK(dunlin.size->sd_ln == 0.6);
    CHECK(dunlin.scatter.flux == 0.05);
    CHECK(dunlin.scatter.redshift == 0.02);
    CHECK(dunlin.scatter.magnitude == 0.1);
    CHECK(dunlin.scatter.size == 0.3);
    CHECK(dunlin.extra_components == 0.5);
    REQUIRE(dunlin.keep.size() == 2);
    CHECK(dunlin.kept_range(Property::size).high == 2.0);
    CHECK(std::isinf(dunlin.kept_range(Property::flux).high));
    REQUIRE(dunlin.exclude.size() == 2);
    CHECK(std::get<BelowExclusion>(dunlin.exclude[1].region).lat_deg == -40.0);
    const auto& gradient = std::get<ExposureGradient>(*dunlin.exposure);
    CHECK(gradient.lowest == 0.6);
    CHECK(gradient.frame == Frame::ecliptic);
    CHECK(gradient.nside == 16);
    CHECK(dunlin.exposure_file() == "w.fits");
    CHECK(dunlin.catalogue_file() == "d.csv");
    CHECK(dunlin.output.frame == Frame::galactic);
    CHECK(dunlin.output.single_precision);
    CHECK(dunlin.output.extension == "ROWS");
    CHECK(dunlin.lon_column() == "L");
    REQUIRE(dunlin.property_columns().size() == 1);
    CHECK(dunlin.property_columns()[0].name == "S");

    const MockSurvey& lantern = scenario.surveys[1];
    CHECK(lantern.intrinsic == Eigen::Vector3d(0.1, 0.2, 0.3));
    CHECK(std::get<DoublePowerLawFlux>(*lantern.flux).turn_flux == 3.0);
    CHECK(lantern.alpha.mean == 0.75);
    CHECK_FALSE(lantern.redshift.has_value());
    CHECK(lantern.property_columns().empty());
    CHECK(lantern.output.frame == Frame::icrs);
}

TEST_CASE("a scenario file without velocity is at rest and its file names it", "[job]") {
    const Scenario scenario =
        parse_scenario("[scenario]\nseed = 1\n[[survey]]\nname = \"dunlin\"\nsources = 2.5\n",
                       "folder/sky.toml",
                       "folder");
    CHECK(scenario.velocity == Eigen::Vector3d::Zero());
    CHECK(scenario.title == "sky.toml");
    CHECK(scenario.frame == Frame::galactic);
}

TEST_CASE("all faults of a scenario file are shown with their places", "[job]") {
    std::string text = replaced(sound, "seed = 7", "seed = -7");
    text = replaced(text, "broken-power-law", "broken-powr-law");
    text = replaced(text, "flux = \"S\"", "flx = \"S\"");
    text = replaced(text, "lat_deg = 90.0", "lat_deg = 91.0");
    text = replaced(text, "precision = \"single\"", "precision = \"half\"");
    text = replaced(text, "sd_ln = 0.6", "sd = 0.6");
    const std::string faults = faults_of(text);
    for (const char* part : {"sky.toml:3:",
                             "did you mean \"broken-power-law\"",
                             "columns.flx",
                             "did you mean \"flux\"",
                             "velocity.lat_deg",
                             "precision",
                             "size.sd_ln",
                             "size.sd"})
        CHECK_THAT(faults, Catch::Contains(part));
}

TEST_CASE("rules between the keys of a scenario are checked too", "[job]") {
    CHECK_THAT(faults_of(replaced(sound, "minimum = 1,", "minimum = 9.99,")),
               Catch::Contains("sky.toml: survey \"dunlin\", flux.minimum: 9.99 is too near"));
    CHECK_THAT(faults_of(replaced(sound, "name = \"lantern\"", "name = \"dunlin\"")),
               Catch::Contains("dunlin"));
    CHECK_THAT(faults_of("[scenario]\nseed = 1\n"), Catch::Contains("survey"));
}

TEST_CASE("scenario files are read from disk with paths of their own folder", "[job]") {
    const test::TemporaryFolder folder;
    CHECK_THROWS_AS(read_scenario(folder / "none.toml"), UsageError);
    const auto path =
        folder.write("sky.toml",
                     "[scenario]\nseed = 1\n[[survey]]\nname = \"dunlin\"\n"
                     "sources = 2\nexposure = \"w.fits\"\nmap_frame = \"icrs\"\n");
    CHECK_THROWS_WITH(read_scenario(path), Catch::Contains("w.fits"));
    folder.write("w.fits", "");
    const Scenario scenario = read_scenario(path);
    const auto& exposure = std::get<ExposureFile>(*scenario.surveys[0].exposure);
    CHECK(exposure.path == folder / "w.fits");
    CHECK(exposure.map_frame == Frame::icrs);
}
