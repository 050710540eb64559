// SPDX-License-Identifier: GPL-2.0-or-later
#include "deviascope/mock/scenario.h"

#include <catch2/catch.hpp>
#include <cmath>
#include <limits>

#include "deviascope/core/error.h"
#include "deviascope/mock/generate.h"

using namespace deviascope;

namespace {

constexpr double inf = std::numeric_limits<double>::infinity();

Scenario sound_scenario() {
    Scenario scenario;
    scenario.velocity = Eigen::Vector3d(0.0, 0.0, 0.1);
    MockSurvey survey;
    survey.name = "dunlin";
    survey.sources = 10;
    survey.flux = PowerLawFlux{1.0, 1.1};
    survey.keep = {{Property::flux, 2.0, inf}};
    scenario.surveys.push_back(survey);
    return scenario;
}

std::string all_problems(const Scenario& scenario) {
    std::string text;
    for (const Message& message : scenario.problems()) text += message.text() + '\n';
    return text;
}

}  // namespace

TEST_CASE("a sound scenario has no problems and no warnings", "[mock]") {
    CHECK(all_problems(sound_scenario()).empty());
    CHECK(sound_scenario().warnings().empty());
}

TEST_CASE("the faintest sources must stay outside the limit for every boost", "[mock]") {
    Scenario scenario = sound_scenario();
    MockSurvey& survey = scenario.surveys[0];
    // The most a source of alpha 0.75 can gain at beta = 0.1: 1.10554159678513^1.75 (the
    // Doppler factor at the apex, special relativity) = 1.19194...
    const double gain = std::pow(1.10554159678513, 1.75);
    survey.flux = PowerLawFlux{2.0 / gain * 0.9999, 1.1};
    CHECK(all_problems(scenario).empty());
    survey.flux = PowerLawFlux{2.0 / gain * 1.0001, 1.1};
    CHECK_THAT(all_problems(scenario),
               Catch::Contains("survey \"dunlin\", flux.minimum") &&
                   Catch::Contains("too near the limit 2 of keep.flux") &&
                   Catch::Contains("at most 1.67"));
    survey.flux = PowerLawFlux{2.0 / gain * 0.9999, 1.1};
    survey.scatter.flux = 0.1;
    CHECK_THAT(all_problems(scenario), Catch::Contains("flux.minimum"));
    survey.scatter.flux = 0.0;
    survey.alpha.sd = 0.3;
    CHECK_THAT(all_problems(scenario), Catch::Contains("flux.minimum"));

    survey.flux.reset();
    survey.alpha = {1.0, 0.0};
    survey.magnitude = MagnitudeDistribution{0.5, 20.1};
    survey.keep = {{Property::magnitude, -inf, 20.0}};
    CHECK_THAT(all_problems(scenario), Catch::Contains("magnitude.limit"));
    survey.magnitude->limit = 20.3;  // 5 log10 1.10554 = 0.2179
    CHECK(all_problems(scenario).empty());
}

TEST_CASE("a catalogue without a limit of its own is warned about", "[mock]") {
    Scenario scenario = sound_scenario();
    scenario.surveys[0].keep.clear();
    scenario.surveys[0].magnitude = MagnitudeDistribution{};
    CHECK(all_problems(scenario).empty());
    REQUIRE(scenario.warnings().size() == 2);
    CHECK_THAT(scenario.warnings()[0], Catch::Contains("no lower flux limit"));
    CHECK_THAT(scenario.warnings()[1], Catch::Contains("no faint magnitude limit"));
}

TEST_CASE("all faults of a scenario are listed at once", "[mock]") {
    Scenario scenario = sound_scenario();
    scenario.velocity *= 20.0;
    scenario.seed = std::uint64_t{1} << 63U;
    MockSurvey& survey = scenario.surveys[0];
    survey.name = "All Sky";
    survey.sources = -1.0;
    survey.intrinsic = Eigen::Vector3d(1.0, 0.0, 0.0);
    survey.alpha.sd = -0.1;
    survey.flux = DoublePowerLawFlux{1.0, 1.0, 2.0, 1.0};
    survey.scatter.size = 0.1;
    survey.extra_components = inf;
    survey.keep = {{Property::flux, 3.0, 3.0}, {Property::size, 1.0, 2.0}};
    survey.output.file = "../dunlin.fits";
    survey.output.columns =
        std::vector<PropertyColumn>{{Property::flux, "ra"}, {Property::magnitude, ""}};
    survey.exposure = ExposureGradient{"", 12, 1.2, 0.0, 0.0, Frame::icrs};
    const std::string text = all_problems(scenario);
    for (const char* part : {"seed",
                             "velocity: length 2",
                             "name: \"All Sky\"",
                             "sources: -1",
                             "intrinsic: length 1",
                             "alpha.sd: -0.1",
                             "flux.bright_slope: 1",
                             "scatter.size",
                             "extra_components: inf",
                             "keep.flux: [3, 3]",
                             "keep.size: the survey does not have this property",
                             "file: \"../dunlin.fits\"",
                             "RA is used twice",
                             "columns: \"\"",
                             "columns.magnitude",
                             "exposure.nside: 12",
                             "exposure.lowest: 1.2"})
        CHECK_THAT(text, Catch::Contains(part));
    CHECK_THROWS_AS(draw_survey(scenario, 0, {}, [](const MockRows&) {}), UsageError);
}

TEST_CASE("names and files of surveys must be unlike", "[mock]") {
    Scenario scenario = sound_scenario();
    scenario.surveys.push_back(scenario.surveys[0]);
    CHECK_THAT(all_problems(scenario),
               Catch::Contains("the name \"dunlin\" is used twice") &&
                   Catch::Contains("the file \"dunlin.fits\" is used twice"));
    scenario.surveys.clear();
    CHECK_THAT(all_problems(scenario), Catch::Contains("at least one is needed"));
}

TEST_CASE("names of properties are those of job files", "[mock]") {
    for (const std::string& name : property_names())
        CHECK(name_of(*property_of_name(name)) == name);
    CHECK_FALSE(property_of_name("colour").has_value());
    MockSurvey survey = sound_scenario().surveys[0];
    CHECK(survey.lon_column() == "RA");
    survey.output.frame = Frame::galactic;
    CHECK(survey.lat_column() == "GLAT");
    REQUIRE(survey.property_columns().size() == 2);
    CHECK(survey.property_columns()[1].name == "FLUX");
}
