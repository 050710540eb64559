// SPDX-License-Identifier: GPL-2.0-or-later
#include <fmt/format.h>

#include <catch2/catch.hpp>
#include <limits>

#include "deviascope/mock/write_mock.h"
#include "python_check.h"
#include "temporary_folder.h"

using namespace deviascope;

namespace {

Scenario scenario_written_thrice() {
    Scenario scenario;
    scenario.seed = 11;
    scenario.velocity = Eigen::Vector3d(0.01, 0.0, -0.02);
    MockSurvey survey;
    survey.name = "double";
    survey.sources = 20000;
    survey.alpha.sd = 0.2;
    survey.flux = BrokenPowerLawFlux{1.0, 5.0, 0.8, 1.6};
    survey.redshift = RedshiftDistribution{};
    survey.magnitude = MagnitudeDistribution{};
    survey.size = SizeDistribution{};
    survey.scatter = {0.05, 0.02, 0.1, 0.05};
    survey.keep = {{Property::flux, 2.1, 40.0}};
    survey.exclude = {{BandExclusion{10.0}, Frame::galactic}};
    scenario.surveys = {survey};
    return scenario;
}

std::string text_of(const MockRows& rows) {
    std::string text;
    for (std::size_t row = 0; row < rows.size(); ++row) {
        const LonLat place = lon_lat_of(rows.position[row]);
        text += fmt::format("{:.17g} {:.17g}", place.lon_deg, place.lat_deg);
        for (const std::vector<double>& values : rows.property)
            text += fmt::format(" {:.17g}", values[row]);
        text += '\n';
    }
    return text;
}

}  // namespace

TEST_CASE("astropy reads every mock catalogue to the last bit", "[mock]") {
    const test::TemporaryFolder folder;
    Scenario scenario = scenario_written_thrice();
    folder.write("rows.txt", text_of(draw_survey_rows(scenario, 0)));
    write_mock(scenario, folder.path(), {}, false);
    scenario.surveys[0].output.file = "single.fits";
    scenario.surveys[0].output.single_precision = true;
    write_mock(scenario, folder.path(), {}, true);
    scenario.surveys[0].output.file = "double.csv";
    scenario.surveys[0].output.lon_column = "R,A";
    scenario.surveys[0].output.single_precision = false;
    write_mock(scenario, folder.path(), {}, true);
    const auto result = test::run_python(
        DEVIASCOPE_TEST_DATA "/reference/mock_catalogue/read_back.py", {folder.path()});
    INFO(result.output);
    CHECK(result.exit_code == 0);
}
