// SPDX-License-Identifier: GPL-2.0-or-later
#include "deviascope/mock/expectation.h"

#include <catch2/catch.hpp>
#include <limits>

using namespace deviascope;

namespace {

constexpr double inf = std::numeric_limits<double>::infinity();

MockSurvey survey_with_alpha(double mean) {
    MockSurvey survey;
    survey.alpha.mean = mean;
    return survey;
}

}  // namespace

TEST_CASE("one flux limit has the weight of Ellis and Baldwin", "[mock]") {
    // Ellis & Baldwin 1984, MNRAS 206, 377: 2 + x (1 + alpha).
    MockSurvey survey = survey_with_alpha(0.8);
    survey.flux = PowerLawFlux{1.0, 1.1};
    CHECK(*expected_weight(survey, {{Property::flux, 2.0, inf}}) ==
          Approx(3.98).epsilon(1e-14));
    CHECK(*expected_weight(survey, {{Property::flux, 2.0, 5.0}}) ==
          Approx(3.98).epsilon(1e-14));
    CHECK(*expected_weight(survey, {}) == 2.0);
    survey.scatter.flux = 0.1;
    CHECK(expected_weight(survey, {{Property::flux, 2.0, 5.0}}).has_value());
}

TEST_CASE("bins with two edges have the weights of their edge terms", "[mock]") {
    // K = 2 + (edge terms)/N, evaluated with 25 digits (mpmath) and confirmed there by the
    // logarithmic derivative of the exact counts. Published form: Takeuchi 2026,
    // arXiv 2602.07389.
    MockSurvey radio = survey_with_alpha(0.75);
    radio.flux = DoublePowerLawFlux{0.1, 1.0, 0.6, 2.2};
    CHECK(*expected_weight(radio, {{Property::flux, 0.5, 1.0}}) == Approx(3.193180781283));
    CHECK(*expected_weight(radio, {{Property::flux, 1.0, 3.0}}) == Approx(4.272659659853));
    CHECK(*expected_weight(radio, {{Property::flux, 3.0, inf}}) == Approx(5.438207809096));

    MockSurvey shells = survey_with_alpha(0.8);
    shells.flux = PowerLawFlux{1.0, 1.2};
    shells.redshift = RedshiftDistribution{0.9, 1.5};
    const KeptRange flux{Property::flux, 2.0, inf};
    const auto weight = [&](double low, double high) {
        return *expected_weight(shells, {flux, {Property::redshift, low, high}});
    };
    CHECK(weight(-inf, 0.4) == Approx(13.649061240044).epsilon(1e-12));
    CHECK(weight(0.4, 0.8) == Approx(8.203093961025).epsilon(1e-12));
    CHECK(weight(0.8, 1.2) == Approx(5.648442604388).epsilon(1e-12));
    CHECK(weight(1.2, inf) == Approx(1.593250639469).epsilon(1e-12));

    MockSurvey sized = survey_with_alpha(0.0);
    sized.size = SizeDistribution{2.0, 0.6};
    CHECK(*expected_weight(sized, {{Property::size, 1.5, 3.0}}) == Approx(1.853806338249));
    CHECK(*expected_weight(sized, {{Property::size, 1.5, inf}}) == Approx(1.133723049936));

    MockSurvey optical = survey_with_alpha(1.0);
    optical.magnitude = MagnitudeDistribution{0.5, 22.0};
    CHECK(*expected_weight(optical, {{Property::magnitude, -inf, 20.0}}) == Approx(4.5));
    optical.alpha.mean = 0.6;
    CHECK(*expected_weight(optical, {{Property::magnitude, -inf, 20.0}}) == Approx(4.0));
}

TEST_CASE("where there is no closed form there is no weight", "[mock]") {
    MockSurvey survey = survey_with_alpha(0.75);
    survey.redshift = RedshiftDistribution{};
    survey.scatter.redshift = 0.05;
    CHECK_FALSE(expected_weight(survey, {{Property::redshift, 0.4, 0.8}}).has_value());
    CHECK(expected_weight(survey, {{Property::redshift, -inf, inf}}).has_value());
    CHECK_FALSE(expected_weight(survey, {{Property::alpha, 0.5, 1.0}}).has_value());
    CHECK_FALSE(expected_weight(survey, {{Property::flux, 1.0, 2.0}}).has_value());
    survey.magnitude = MagnitudeDistribution{0.5, 20.0};
    CHECK_FALSE(expected_weight(survey, {{Property::magnitude, 21.0, 22.0}}).has_value());
}

TEST_CASE("components make the dispersion of a compound Poisson number", "[mock]") {
    MockSurvey survey;
    CHECK(expected_dispersion(survey) == 1.0);
    // By hand, m = 0.5: E[k] = 1.5, E[k^2] = 1.5^2 + 0.5 = 2.75.
    survey.extra_components = 0.5;
    CHECK(expected_dispersion(survey) == Approx(2.75 / 1.5).epsilon(1e-15));
}
