// SPDX-License-Identifier: GPL-2.0-or-later
// What mock skies must show whatever they are made of: the distributions they name, and the
// dipoles that special relativity gives them.
#include <Eigen/Geometry>
#include <algorithm>
#include <catch2/catch.hpp>
#include <cmath>
#include <functional>
#include <limits>
#include <numbers>

#include "deviascope/mock/generate.h"

using namespace deviascope;

namespace {

constexpr double inf = std::numeric_limits<double>::infinity();

/// Kolmogorov-Smirnov statistic D sqrt(n) against a cumulative distribution.
double kolmogorov(std::vector<double> values, const std::function<double(double)>& cumulative) {
    std::sort(values.begin(), values.end());
    const auto n = static_cast<double>(values.size());
    double largest = 0.0;
    for (std::size_t i = 0; i < values.size(); ++i) {
        const double expected = cumulative(values[i]);
        largest = std::max({largest,
                            expected - static_cast<double>(i) / n,
                            static_cast<double>(i + 1) / n - expected});
    }
    return largest * std::sqrt(n);
}

// Kolmogorov 1933: P(D sqrt(n) > 2.23) = 2 exp(-2 * 2.23^2) = 1e-4.
constexpr double kolmogorov_bound = 2.23;

double normal_cumulative(double deviate) {
    return 0.5 * std::erfc(-deviate / std::numbers::sqrt2);
}

Scenario scenario_of(std::uint64_t seed, double sources) {
    Scenario scenario;
    scenario.seed = seed;
    MockSurvey survey;
    survey.name = "dunlin";
    survey.sources = sources;
    survey.output.frame = scenario.frame;
    scenario.surveys.push_back(survey);
    return scenario;
}

/// Sums of the positions of the sources in one bin.
struct DipoleSum {
    KeptRange bin;
    double n = 0.0;
    Eigen::Vector3d first = Eigen::Vector3d::Zero();
    Eigen::Matrix3d second = Eigen::Matrix3d::Zero();

    void add(const Direction& position) {
        n += 1.0;
        first += position;
        second += position * position.transpose();
    }
    /// 3 <n>: the l = 1 vector of full-sky counts.
    Eigen::Vector3d dipole() const { return 3.0 * first / n; }
    /// Deviation of a component of the dipole from its expectation in standard deviations.
    double pull(const Direction& along, double expected) const {
        const double mean = along.dot(first) / n;
        const double variance = along.dot(second * along) / n - mean * mean;
        return (3.0 * mean - expected) / (3.0 * std::sqrt(variance / n));
    }
};

const Direction heading = Direction(2.0, -1.0, 2.0) / 3.0;

/// Draws a survey moving at beta = 0.1 and checks the dipole of each bin: along the velocity
/// against its exact amplitude, across it against 0.
void check_amplitudes(Scenario scenario,
                      const std::vector<std::pair<KeptRange, double>>& bins) {
    scenario.velocity = 0.1 * heading;
    std::vector<DipoleSum> sums;
    for (const auto& [bin, amplitude] : bins) sums.push_back({bin});
    MockOptions options;
    options.threads = 2;
    draw_survey(scenario, 0, options, [&](const MockRows& rows) {
        for (DipoleSum& sum : sums) {
            const std::vector<double>& values = rows.of(sum.bin.property);
            for (std::size_t row = 0; row < rows.size(); ++row)
                if (values[row] >= sum.bin.low && values[row] < sum.bin.high)
                    sum.add(rows.position[row]);
        }
    });
    for (std::size_t number = 0; number < bins.size(); ++number) {
        const DipoleSum& sum = sums[number];
        CAPTURE(bins[number].first.low, bins[number].second, sum.n, sum.dipole().norm());
        CHECK(sum.n > 1e5);
        CHECK(std::abs(sum.pull(heading, bins[number].second)) < 4.0);
        CHECK(std::abs(sum.pull(heading.unitOrthogonal(), 0.0)) < 4.0);
        CHECK(std::abs(sum.pull(heading.cross(heading.unitOrthogonal()), 0.0)) < 4.0);
    }
}

}  // namespace

TEST_CASE("drawn properties have the distributions they name", "[mock]") {
    Scenario scenario = scenario_of(101, 300000);
    MockSurvey& survey = scenario.surveys[0];
    survey.alpha = {0.75, 0.25};
    survey.redshift = RedshiftDistribution{0.9, 1.5};
    survey.magnitude = MagnitudeDistribution{0.55, 21.0};
    survey.size = SizeDistribution{2.0, 0.6};
    const std::vector<FluxDistribution> laws = {PowerLawFlux{2.0, 1.1},
                                                BrokenPowerLawFlux{0.5, 3.0, 0.8, 1.7},
                                                DoublePowerLawFlux{0.1, 1.0, 0.6, 2.2}};
    const std::vector<std::function<double(double)>> flux_laws = {
        [](double s) { return 1.0 - std::pow(s / 2.0, -1.1); },
        [](double s) {
            return s < 3.0 ? 1.0 - std::pow(s / 0.5, -0.8)
                           : 1.0 - std::pow(6.0, -0.8) * std::pow(s / 3.0, -1.7);
        },
        [](double s) {
            return 1.0 - (std::pow(0.1, 0.6) + std::pow(0.1, 2.2)) /
                             (std::pow(s, 0.6) + std::pow(s, 2.2));
        }};
    for (std::size_t law = 0; law < laws.size(); ++law) {
        scenario.seed = 101 + law;
        survey.flux = laws[law];
        const MockRows rows = draw_survey_rows(scenario, 0, 2);
        CHECK(kolmogorov(rows.of(Property::flux), flux_laws[law]) < kolmogorov_bound);
        if (law > 0) continue;
        CHECK(kolmogorov(rows.of(Property::alpha), [](double alpha) {
                  return normal_cumulative((alpha - 0.75) / 0.25);
              }) < kolmogorov_bound);
        CHECK(kolmogorov(rows.of(Property::redshift), [](double z) {
                  const double t = std::pow(z / 0.9, 1.5);
                  return 1.0 - (1.0 + t) * std::exp(-t);
              }) < kolmogorov_bound);
        CHECK(kolmogorov(rows.of(Property::magnitude), [](double m) {
                  return std::pow(10.0, 0.55 * (m - 21.0));
              }) < kolmogorov_bound);
        CHECK(kolmogorov(rows.of(Property::size), [](double s) {
                  return normal_cumulative(std::log(s / 2.0) / 0.6);
              }) < kolmogorov_bound);
    }
}

TEST_CASE("measurement scatter is Gaussian of the stated width", "[mock]") {
    Scenario scenario = scenario_of(131, 200000);
    MockSurvey& survey = scenario.surveys[0];
    survey.flux = PowerLawFlux{1.0, 1.1};
    survey.redshift = RedshiftDistribution{};
    survey.magnitude = MagnitudeDistribution{};
    survey.size = SizeDistribution{};
    // Scatter is drawn after everything else, so the same sources come without it.
    const MockRows exact = draw_survey_rows(scenario, 0, 2);
    survey.scatter = {0.1, 0.05, 0.3, 0.2};
    const MockRows measured = draw_survey_rows(scenario, 0, 2);
    REQUIRE(exact.size() == measured.size());
    CHECK(exact.position == measured.position);
    const auto check = [&](Property property, const std::function<double(double)>& width) {
        std::vector<double> deviates;
        for (std::size_t row = 0; row < exact.size(); ++row)
            deviates.push_back((measured.of(property)[row] - exact.of(property)[row]) /
                               width(exact.of(property)[row]));
        CHECK(kolmogorov(deviates, normal_cumulative) < kolmogorov_bound);
    };
    check(Property::flux, [](double flux) { return 0.1 * flux; });
    check(Property::redshift, [](double z) { return 0.05 * (1.0 + z); });
    check(Property::magnitude, [](double) { return 0.3; });
    check(Property::size, [](double size) { return 0.2 * size; });
}

TEST_CASE("an intrinsic dipole is drawn exactly and recovered", "[mock]") {
    const Direction axis = Direction(-0.48, 0.6, 0.64);
    for (const double amplitude : {0.0, 0.05, 0.9}) {
        Scenario scenario = scenario_of(151, 1e6);
        scenario.surveys[0].intrinsic = amplitude * axis;
        const MockRows rows = draw_survey_rows(scenario, 0, 2);
        std::vector<double> cosines, azimuths;
        DipoleSum sum;
        const Direction across = axis.unitOrthogonal();
        for (const Direction& n : rows.position) {
            sum.add(n);
            cosines.push_back(axis.dot(n));
            azimuths.push_back(std::atan2(n.dot(axis.cross(across)), n.dot(across)));
        }
        CAPTURE(amplitude, sum.dipole());
        CHECK(std::abs(sum.pull(axis, amplitude)) < 4.0);
        CHECK(std::abs(sum.pull(across, 0.0)) < 4.0);
        CHECK(kolmogorov(cosines, [&](double mu) {
                  return 0.5 * (1.0 + mu) + 0.25 * amplitude * (mu * mu - 1.0);
              }) < kolmogorov_bound);
        CHECK(kolmogorov(azimuths, [](double azimuth) {
                  return 0.5 + 0.5 * azimuth / std::numbers::pi;
              }) < kolmogorov_bound);
    }
}

// Exact l = 1 amplitudes D(0.1) of boosted isotropic populations by quadrature over the sky,
// D = 3 <mu' N(delta)> / <N(delta)> with N(delta) the counts of the population inside the bin
// at Doppler factor delta (mpmath; checked there against 4e7 boosted sources).
TEST_CASE("a flux-limited power law shows its exact kinematic dipole", "[mock]") {
    Scenario scenario = scenario_of(171, 7.5e6);
    MockSurvey& survey = scenario.surveys[0];
    survey.alpha.mean = 0.8;
    survey.flux = PowerLawFlux{1.5, 1.1};
    survey.keep = {{Property::flux, 2.0, inf}};
    check_amplitudes(
        scenario,
        {{{Property::flux, 2.0, inf}, 0.396709223}, {{Property::flux, 2.0, 5.0}, 0.396709223}});
}

TEST_CASE("flux bins of a double power law show their own dipoles", "[mock]") {
    Scenario scenario = scenario_of(172, 5e6);
    MockSurvey& survey = scenario.surveys[0];
    survey.flux = DoublePowerLawFlux{0.4, 1.0, 0.6, 2.2};
    survey.keep = {{Property::flux, 0.5, inf}};
    check_amplitudes(scenario,
                     {{{Property::flux, 0.5, 1.0}, 0.319134830},
                      {{Property::flux, 1.0, 3.0}, 0.424462106},
                      {{Property::flux, 3.0, inf}, 0.537517648}});
}

TEST_CASE("redshift shells of a flux-limited sample show their own dipoles", "[mock]") {
    Scenario scenario = scenario_of(173, 6e6);
    MockSurvey& survey = scenario.surveys[0];
    survey.alpha.mean = 0.8;
    survey.flux = PowerLawFlux{1.6, 1.2};
    survey.redshift = RedshiftDistribution{0.9, 1.5};
    survey.keep = {{Property::flux, 2.0, inf}};
    check_amplitudes(scenario,
                     {{{Property::redshift, -inf, 0.4}, 1.217564833},
                      {{Property::redshift, 0.4, 0.8}, 0.786927231},
                      {{Property::redshift, 0.8, 1.2}, 0.552777025},
                      {{Property::redshift, 1.2, inf}, 0.158208416}});
}

TEST_CASE("magnitude limits show the dipole of their spectral index", "[mock]") {
    Scenario scenario = scenario_of(174, 6e6);
    MockSurvey& survey = scenario.surveys[0];
    survey.alpha.mean = 1.0;  // bolometric: 2 + 5 s
    survey.magnitude = MagnitudeDistribution{0.5, 20.3};
    survey.keep = {{Property::magnitude, -inf, 20.0}};
    check_amplitudes(scenario, {{{Property::magnitude, -inf, 20.0}, 0.447540810}});
    scenario.seed = 175;
    survey.alpha.mean = 0.6;
    check_amplitudes(scenario, {{{Property::magnitude, -inf, 20.0}, 0.398671096}});
}

TEST_CASE("angular size bins show the dipole of shrinking sources", "[mock]") {
    Scenario scenario = scenario_of(176, 5e6);
    scenario.surveys[0].size = SizeDistribution{2.0, 0.6};
    check_amplitudes(
        scenario,
        {{{Property::size, 1.5, 3.0}, 0.185668409}, {{Property::size, 1.5, inf}, 0.113620496}});
}

TEST_CASE("a spread of alpha at the limit acts by the exact mixture", "[mock]") {
    // Counts at Doppler factor delta of N ~ S^-x with alpha normal (a, s):
    // delta^2 E[delta^(x(1+alpha))] = delta^(2+x(1+a)) exp((x s ln delta)^2 / 2); the moment of
    // a log-normal variate. Amplitude by Simpson's rule over mu' here.
    const double beta = 0.1, x = 1.1, a = 0.75, s = 0.3;
    double weighted = 0.0, total = 0.0;
    constexpr int n_steps = 2000;
    for (int step = 0; step <= n_steps; ++step) {
        const double mu = -1.0 + 2.0 * step / n_steps;
        const double log_delta = -std::log((1.0 - beta * mu) / std::sqrt(1.0 - beta * beta));
        const double counts =
            std::exp((2.0 + x * (1.0 + a)) * log_delta + 0.5 * std::pow(x * s * log_delta, 2));
        const double simpson = step == 0 || step == n_steps ? 1.0 : step % 2 == 1 ? 4.0 : 2.0;
        total += simpson * counts;
        weighted += simpson * counts * mu;
    }
    Scenario scenario = scenario_of(177, 6e6);
    MockSurvey& survey = scenario.surveys[0];
    survey.alpha = {a, s};
    survey.flux = PowerLawFlux{1.4, x};
    survey.keep = {{Property::flux, 2.0, inf}};
    check_amplitudes(scenario, {{{Property::flux, 2.0, inf}, 3.0 * weighted / total}});
}

TEST_CASE("motion and an intrinsic dipole act together as the exact integral says", "[mock]") {
    // Counts above a limit per solid angle at rest: (1 + D.n) delta^(x(1+alpha)), seen at n'.
    // The mean of n' by a product rule (midpoint in azimuth, Simpson in mu) over the sphere.
    const Eigen::Vector3d beta(0.05, -0.06, 0.03);
    const Eigen::Vector3d intrinsic(-0.1, 0.15, 0.2);
    const double x = 1.1, alpha = 0.75;
    const double gamma = 1.0 / std::sqrt(1.0 - beta.squaredNorm());
    double total = 0.0;
    Eigen::Vector3d weighted = Eigen::Vector3d::Zero();
    constexpr int n_rings = 200, n_azimuths = 64;
    for (int ring = 0; ring <= n_rings; ++ring) {
        const double z = -1.0 + 2.0 * ring / n_rings;
        const double simpson = ring == 0 || ring == n_rings ? 1.0 : ring % 2 == 1 ? 4.0 : 2.0;
        for (int step = 0; step < n_azimuths; ++step) {
            const double azimuth = 2.0 * std::numbers::pi * (step + 0.5) / n_azimuths;
            const double r = std::sqrt(1.0 - z * z);
            const Eigen::Vector3d n(r * std::cos(azimuth), r * std::sin(azimuth), z);
            const double along = beta.dot(n);
            const double delta = gamma * (1.0 + along);
            const Eigen::Vector3d seen =
                (n + ((gamma - 1.0) * along / beta.squaredNorm() + gamma) * beta) / delta;
            const double counts =
                simpson * (1.0 + intrinsic.dot(n)) * std::pow(delta, x * (1.0 + alpha));
            total += counts;
            weighted += counts * seen;
        }
    }
    const Eigen::Vector3d expected = 3.0 * weighted / total;

    Scenario scenario = scenario_of(178, 6e6);
    scenario.velocity = beta;
    MockSurvey& survey = scenario.surveys[0];
    survey.intrinsic = intrinsic;
    survey.flux = PowerLawFlux{1.6, x};
    survey.keep = {{Property::flux, 2.0, inf}};
    DipoleSum sum;
    MockOptions options;
    options.threads = 2;
    draw_survey(scenario, 0, options, [&](const MockRows& rows) {
        for (const Direction& position : rows.position) sum.add(position);
    });
    CAPTURE(expected.transpose(), sum.dipole().transpose());
    for (int axis = 0; axis < 3; ++axis)
        CHECK(std::abs(sum.pull(Eigen::Vector3d::Unit(axis), expected(axis))) < 4.0);
}
