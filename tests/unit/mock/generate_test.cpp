// SPDX-License-Identifier: GPL-2.0-or-later
#include "deviascope/mock/generate.h"

#include <catch2/catch.hpp>
#include <cmath>
#include <limits>

#include "deviascope/core/error.h"
#include "deviascope/mock/exposure.h"
#include "temporary_folder.h"

using namespace deviascope;

namespace {

constexpr double inf = std::numeric_limits<double>::infinity();

/// A survey with every property, none cut.
Scenario full_scenario() {
    Scenario scenario;
    scenario.seed = 20260817;
    MockSurvey survey;
    survey.name = "binnacle";
    survey.sources = 40000;
    survey.alpha = {0.75, 0.2};
    survey.flux = PowerLawFlux{1.0, 1.1};
    survey.redshift = RedshiftDistribution{};
    survey.magnitude = MagnitudeDistribution{0.5, 22.0};
    survey.size = SizeDistribution{};
    scenario.surveys.push_back(survey);
    return scenario;
}

const Eigen::Vector3d fast(0.06, -0.03, 0.09);

void check_equal(const MockRows& a, const MockRows& b) {
    CHECK(a.position == b.position);
    CHECK(a.property == b.property);
}

}  // namespace

TEST_CASE("the same sources are seen at rest and in motion, moved as relativity says",
          "[mock]") {
    Scenario scenario = full_scenario();
    scenario.surveys[0].intrinsic = Eigen::Vector3d(0.3, 0.2, -0.1);
    scenario.surveys[0].output.frame = scenario.frame;
    const MockRows rest = draw_survey_rows(scenario, 0);
    scenario.velocity = fast;
    const MockRows moving = draw_survey_rows(scenario, 0);
    REQUIRE(rest.size() == moving.size());
    REQUIRE(rest.size() > 39000);
    // The textbook form with a unit vector along the velocity, in long double.
    const long double beta = std::sqrt(static_cast<long double>(fast.squaredNorm()));
    const long double gamma = 1.0L / std::sqrt((1.0L - beta) * (1.0L + beta));
    const Eigen::Matrix<long double, 3, 1> along = fast.cast<long double>() / beta;
    double worst = 0.0;
    for (std::size_t row = 0; row < rest.size(); ++row) {
        const Eigen::Matrix<long double, 3, 1> n = rest.position[row].cast<long double>();
        const long double mu = n.dot(along);
        const long double delta = gamma * (1.0L + beta * mu);
        const Eigen::Matrix<long double, 3, 1> seen =
            (n + ((gamma - 1.0L) * mu + gamma * beta) * along) / delta;
        const long double alpha = rest.of(Property::alpha)[row];
        const auto off = [&](double found, long double exact) {
            worst = std::max(worst, static_cast<double>(std::abs(found / exact - 1.0L)));
        };
        const auto before = [&](Property p) -> long double { return rest.of(p)[row]; };
        const auto after = [&](Property p) { return moving.of(p)[row]; };
        const double moved = (moving.position[row] - seen.cast<double>()).norm();
        worst = std::max(worst, moved);
        off(after(Property::flux), before(Property::flux) * std::pow(delta, 1.0L + alpha));
        off(1.0 + after(Property::redshift), (1.0L + before(Property::redshift)) / delta);
        off(after(Property::magnitude),
            before(Property::magnitude) - 2.5L * (1.0L + alpha) * std::log10(delta));
        off(after(Property::size), before(Property::size) / delta);
    }
    CHECK(worst < 2e-15);
    CHECK(rest.of(Property::alpha) == moving.of(Property::alpha));
}

TEST_CASE("the number of threads changes no bit", "[mock]") {
    Scenario scenario = full_scenario();
    scenario.velocity = fast;
    MockSurvey& survey = scenario.surveys[0];
    survey.sources = 150000;  // several pieces
    survey.scatter = {0.1, 0.03, 0.2, 0.05};
    survey.extra_components = 0.3;
    survey.keep = {{Property::flux, 1.8, inf}};
    survey.flux = PowerLawFlux{0.5, 1.1};
    MockOptions options;
    options.threads = 3;
    std::vector<std::int64_t> totals;
    const MockTally tally = draw_survey(scenario, 0, options, [&](const MockRows& rows) {
        totals.push_back(static_cast<std::int64_t>(rows.size()));
    });
    CHECK(totals.size() > 4);
    const MockRows one = draw_survey_rows(scenario, 0, 1);
    CHECK(tally.rows == static_cast<std::int64_t>(one.size()));
    check_equal(one, draw_survey_rows(scenario, 0, 3));
}

TEST_CASE("every source drawn is accounted for", "[mock]") {
    Scenario scenario = full_scenario();
    MockSurvey& survey = scenario.surveys[0];
    survey.keep = {{Property::flux, 1.2, inf}, {Property::redshift, 0.2, 2.0}};
    survey.exclude = {{BandExclusion{10.0}, Frame::galactic},
                      {BelowExclusion{-30.0}, Frame::icrs}};
    survey.exposure = ExposureGradient{"", 8, 0.5, 30.0, 40.0, Frame::icrs};
    survey.extra_components = 0.7;
    const MockTally tally = draw_survey(scenario, 0, {}, [](const MockRows&) {});
    REQUIRE(tally.excluded.size() == 2);
    CHECK(tally.drawn == tally.outside_kept_range + tally.excluded[0] + tally.excluded[1] +
                             tally.thinned + tally.kept);
    CHECK(tally.excluded[0] > 0);
    CHECK(tally.excluded[1] > 0);
    CHECK(tally.thinned > 0);
    CHECK(tally.rows > tally.kept);
    CHECK(tally.finished);
}

TEST_CASE("ranges, exclusions and 0 or 1 exposures keep exactly their sources", "[mock]") {
    Scenario scenario = full_scenario();
    scenario.velocity = fast;
    MockSurvey& survey = scenario.surveys[0];
    survey.keep = {{Property::flux, 1.5, inf}};
    survey.flux = PowerLawFlux{0.5, 1.1};
    const MockRows all = draw_survey_rows(scenario, 0);

    const Exclusion disc{DiscExclusion{80.0, -20.0, 25.0}, Frame::icrs};
    const Pixelisation grid(4);
    HealpixMap checkers;
    checkers.nside = 4;
    checkers.frame = Frame::ecliptic;
    for (std::int64_t pixel = 0; pixel < grid.n_pixels(); ++pixel)
        checkers.value.push_back(pixel % 3 == 0 ? 0.0 : 1.0);
    checkers.value[7] = std::numeric_limits<double>::quiet_NaN();
    const test::TemporaryFolder folder;
    write_healpix_map(folder / "checkers.fits", checkers, "EXPOSURE");
    survey.exclude = {disc};
    survey.exposure = ExposureFile{folder / "checkers.fits", {}};
    survey.keep.push_back({Property::size, 1.0, 2.0});
    const MockRows kept = draw_survey_rows(scenario, 0);

    const Eigen::Matrix3d to_ecliptic = rotation(Frame::icrs, Frame::ecliptic);
    const Direction centre = direction_of(80.0, -20.0);
    MockRows expected;
    for (std::size_t row = 0; row < all.size(); ++row) {
        const Direction& position = all.position[row];
        const double size = all.of(Property::size)[row];
        const auto pixel = grid.pixel_at(to_ecliptic * position);
        const bool in_map = pixel % 3 != 0 && pixel != 7;
        const double disc_radius = 25.0 * 3.14159265358979323846 / 180.0;
        if (size < 1.0 || size >= 2.0 || !in_map) continue;
        if (separation(position, centre) <= disc_radius) continue;
        expected.position.push_back(position);
        for (std::size_t which = 0; which < n_properties; ++which)
            expected.property[which].push_back(all.property[which][row]);
    }
    CHECK(expected.size() > 1000);
    check_equal(kept, expected);
}

TEST_CASE("a fractional exposure keeps its fraction of the sources", "[mock]") {
    Scenario scenario = full_scenario();
    MockSurvey& survey = scenario.surveys[0];
    survey.sources = 200000;
    const ExposureGradient gradient{"", 2, 0.2, 0.0, 90.0, Frame::icrs};
    const MockRows all = draw_survey_rows(scenario, 0);
    survey.exposure = gradient;
    const MockRows thinned = draw_survey_rows(scenario, 0);
    const HealpixMap map = exposure_map(gradient);
    const Pixelisation grid(2);
    std::vector<double> before(48, 0.0), after(48, 0.0);
    for (const Direction& n : all.position)
        ++before[static_cast<std::size_t>(grid.pixel_at(n))];
    for (const Direction& n : thinned.position)
        ++after[static_cast<std::size_t>(grid.pixel_at(n))];
    double chi_squared = 0.0;
    for (std::size_t pixel = 0; pixel < 48; ++pixel) {
        const double w = map.value[pixel];
        const double expected = before[pixel] * w;
        chi_squared += std::pow(after[pixel] - expected, 2) / (expected * (1.0 - w));
    }
    // Chi-squared with 48 degrees: 1e-4 quantiles 18.3 and 94.3 (scipy.stats.chi2).
    CHECK(chi_squared > 18.3);
    CHECK(chi_squared < 94.3);
    // Centre of RING pixel 0 at nside 2: z = 1 - 1/12 (Gorski et al. 2005, Eq. 4).
    CHECK(map.value[0] == Approx(1.0 - 0.8 * 0.5 * (1.0 + 11.0 / 12.0)).epsilon(1e-14));
}

TEST_CASE("totals are Poisson and components make them compound", "[mock]") {
    Scenario scenario = full_scenario();
    MockSurvey& survey = scenario.surveys[0];
    survey.flux.reset();
    survey.magnitude.reset();
    survey.sources = 100.0;
    survey.extra_components = 0.5;
    double drawn = 0.0, drawn_squared = 0.0, rows = 0.0, rows_squared = 0.0;
    constexpr int n_skies = 4000;
    for (int sky = 0; sky < n_skies; ++sky) {
        scenario.seed = static_cast<std::uint64_t>(1000 + sky);
        const MockTally tally = draw_survey(scenario, 0, {}, [](const MockRows&) {});
        const auto n = static_cast<double>(tally.drawn) - 100.0;
        const auto m = static_cast<double>(tally.rows) - 150.0;
        drawn += n / n_skies;
        drawn_squared += n * n / n_skies;
        rows += m / n_skies;
        rows_squared += m * m / n_skies;
    }
    // Poisson: variance 100, so the mean of 4000 has sd 0.158 and the variance sd 2.24.
    CHECK(std::abs(drawn) < 4.0 * 0.158);
    CHECK(std::abs(drawn_squared - 100.0) < 4.0 * 2.24);
    // Compound Poisson: mean 150, variance 100 E[k^2] = 275.
    CHECK(std::abs(rows) < 4.0 * std::sqrt(275.0 / n_skies));
    CHECK(std::abs(rows_squared - 275.0) < 4.0 * 275.0 * std::sqrt(2.0 / n_skies) * 1.05);
}

TEST_CASE("surveys and seeds have unlike sources, and repeats the same", "[mock]") {
    Scenario scenario = full_scenario();
    scenario.surveys[0].sources = 100;
    scenario.surveys.push_back(scenario.surveys[0]);
    scenario.surveys[1].name = "lubber-line";
    const MockRows first = draw_survey_rows(scenario, 0);
    CHECK(first.position[0] != draw_survey_rows(scenario, 1).position[0]);
    check_equal(first, draw_survey_rows(scenario, 0));
    scenario.seed += 1;
    CHECK(first.position[0] != draw_survey_rows(scenario, 0).position[0]);
}

TEST_CASE("a stopped draw says so", "[mock]") {
    const Scenario scenario = full_scenario();
    MockOptions options;
    int asked = 0;
    options.stop_requested = [&] { return ++asked > 1; };
    std::vector<std::string> lines;
    options.progress = [&](const std::string& line) { lines.push_back(line); };
    const MockTally tally = draw_survey(scenario, 0, options, [](const MockRows&) {});
    CHECK_FALSE(tally.finished);
    CHECK(tally.drawn > 0);
    CHECK(tally.drawn < 39000);
    REQUIRE(lines.size() == 1);
    CHECK_THAT(lines[0], Catch::Contains("binnacle") && Catch::Contains("sources drawn"));
}

TEST_CASE("exposure maps without a frame or with wrong values are refused", "[mock]") {
    const test::TemporaryFolder folder;
    HealpixMap map;
    map.nside = 1;
    map.value.assign(12, 1.0);
    write_healpix_map(folder / "bare.fits", map, "EXPOSURE");
    CHECK_THROWS_WITH(exposure_map(ExposureFile{folder / "bare.fits", {}}),
                      Catch::Contains("COORDSYS") && Catch::Contains("map_frame"));
    CHECK(exposure_map(ExposureFile{folder / "bare.fits", Frame::icrs}).frame == Frame::icrs);
    map.frame = Frame::galactic;
    map.value[5] = 1.5;
    write_healpix_map(folder / "high.fits", map, "EXPOSURE");
    CHECK_THROWS_WITH(exposure_map(ExposureFile{folder / "high.fits", Frame::icrs}),
                      Catch::Contains("COORDSYS says galactic, map_frame icrs"));
    CHECK_THROWS_WITH(exposure_map(ExposureFile{folder / "high.fits", {}}),
                      Catch::Contains("pixel 5") && Catch::Contains("1.5"));
}
