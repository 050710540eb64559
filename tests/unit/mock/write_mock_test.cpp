// SPDX-License-Identifier: GPL-2.0-or-later
#include "deviascope/mock/write_mock.h"

#include <catch2/catch.hpp>
#include <fstream>
#include <limits>
#include <sstream>

#include "deviascope/core/digest.h"
#include "deviascope/core/error.h"
#include "temporary_folder.h"

using namespace deviascope;

namespace {

constexpr double inf = std::numeric_limits<double>::infinity();

Scenario small_scenario() {
    Scenario scenario;
    scenario.title = "a \"small\" sky";
    scenario.seed = 5;
    scenario.velocity = Eigen::Vector3d(0.0, 0.0, 1e-3);
    MockSurvey survey;
    survey.name = "dunlin";
    survey.sources = 3000;
    survey.flux = PowerLawFlux{1.0, 1.1};
    survey.keep = {{Property::flux, 2.0, inf}};
    survey.exclude = {{BandExclusion{10.0}, Frame::galactic}};
    survey.exposure = ExposureGradient{"", 4, 0.5, 0.0, 90.0, Frame::icrs};
    scenario.surveys = {survey, survey};
    scenario.surveys[1].name = "lantern";
    scenario.surveys[1].output.file = "lantern.csv";
    scenario.surveys[1].exposure.reset();
    return scenario;
}

std::string text_of(const std::filesystem::path& path) {
    std::ifstream file(path, std::ios::binary);
    std::ostringstream text;
    text << file.rdbuf();
    return text.str();
}

std::size_t n_files(const std::filesystem::path& folder) {
    std::size_t n = 0;
    for (const auto& entry : std::filesystem::directory_iterator(folder)) {
        static_cast<void>(entry);
        ++n;
    }
    return n;
}

}  // namespace

TEST_CASE("a mock sky is the same files for any number of threads", "[mock]") {
    const test::TemporaryFolder folder;
    MockOptions options;
    const MockReport one = write_mock(small_scenario(), folder / "one", options, false);
    options.threads = 3;
    const MockReport three = write_mock(small_scenario(), folder / "three", options, false);
    REQUIRE(one.files.size() == 4);
    CHECK(n_files(folder / "one") == 4);
    for (std::size_t file = 0; file < one.files.size(); ++file)
        CHECK(digest_of_file(one.files[file]) == digest_of_file(three.files[file]));
    CHECK(one.files.back().filename() == "truth.toml");
}

TEST_CASE("existing files are replaced only when asked", "[mock]") {
    const test::TemporaryFolder folder;
    write_mock(small_scenario(), folder.path(), {}, false);
    CHECK_THROWS_AS(write_mock(small_scenario(), folder.path(), {}, false), OutputError);
    CHECK_NOTHROW(write_mock(small_scenario(), folder.path(), {}, true));
    // An old truth does not outlive a run that was stopped.
    MockOptions options;
    options.stop_requested = [] { return true; };
    write_mock(small_scenario(), folder.path(), options, true);
    CHECK_FALSE(std::filesystem::exists(folder / "truth.toml"));
}

TEST_CASE("a stopped mock leaves no unfinished file", "[mock]") {
    const test::TemporaryFolder folder;
    MockOptions options;
    options.stop_requested = [] { return true; };
    const MockReport report = write_mock(small_scenario(), folder.path(), options, false);
    CHECK_FALSE(report.finished);
    CHECK(report.files.empty());
    CHECK(n_files(folder.path()) == 0);
}

TEST_CASE("the truth says what the sky was made with", "[mock]") {
    const test::TemporaryFolder folder;
    const MockReport report = write_mock(small_scenario(), folder.path(), {}, false);
    const std::string text = text_of(folder / "truth.toml");
    CHECK_THAT(text, Catch::Contains("title = \"a \\\"small\\\" sky\""));
    CHECK_THAT(text, Catch::Contains("speed_km_s = 299.792458\n"));
    CHECK_THAT(text, Catch::Contains("vector = [0.0, 0.0, 0.001]"));
    CHECK_THAT(text, Catch::Contains("keep = { flux = [2.0, inf] }"));
    // 2 + 1.1 (1 + 0.75), Ellis & Baldwin 1984.
    CHECK_THAT(text, Catch::Contains("kinematic_weight = 3.925"));
    CHECK_THAT(text, Catch::Contains("rows = " + std::to_string(report.tally[0].rows)));
}

TEST_CASE("a folder that cannot be made is an output error", "[mock]") {
    const test::TemporaryFolder folder;
    folder.write("file", "");
    CHECK_THROWS_AS(write_mock(small_scenario(), folder / "file" / "sky", {}, false),
                    OutputError);
}
