// SPDX-License-Identifier: GPL-2.0-or-later
#include "deviascope/mock/population.h"

#include <catch2/catch.hpp>
#include <cmath>
#include <limits>

#include "deviascope/core/random.h"

using namespace deviascope;

namespace {

constexpr double inf = std::numeric_limits<double>::infinity();

/// Root of a decreasing N(>S) = fraction in ln S by bisection in long double.
long double flux_by_bisection(const DoublePowerLawFlux& law, long double fraction) {
    const auto number = [&](long double flux) {
        const long double r = flux / static_cast<long double>(law.turn_flux);
        return 1.0L / (std::pow(r, static_cast<long double>(law.faint_slope)) +
                       std::pow(r, static_cast<long double>(law.bright_slope)));
    };
    const long double wanted = number(static_cast<long double>(law.minimum)) * fraction;
    long double low = std::log(static_cast<long double>(law.minimum));
    long double high = low + 200.0L;
    for (int halving = 0; halving < 120; ++halving) {
        const long double middle = 0.5L * (low + high);
        (number(std::exp(middle)) > wanted ? low : high) = middle;
    }
    return std::exp(0.5L * (low + high));
}

}  // namespace

TEST_CASE("the cosine to a dipole inverts its cumulative distribution", "[mock]") {
    for (const double dipole : {0.0, 1e-12, 0.004, 0.5, 0.999}) {
        CHECK(polar_cosine_of(dipole, 0.0) == Approx(-1.0).epsilon(1e-14));
        CHECK(polar_cosine_of(dipole, 1.0) == Approx(1.0).epsilon(1e-14));
        for (int step = 1; step < 64; ++step) {
            const double fraction = step / 64.0;
            const double mu = polar_cosine_of(dipole, fraction);
            // The integral of (1 + D mu)/2 from -1.
            const double cumulative = 0.5 * (1.0 + mu) + 0.25 * dipole * (mu * mu - 1.0);
            CHECK(std::abs(cumulative - fraction) < 3e-16);
        }
    }
    CHECK(polar_cosine_of(0.0, 0.75) == 0.5);
}

TEST_CASE("flux laws begin at their minimum and invert themselves", "[mock]") {
    const std::vector<FluxDistribution> laws = {PowerLawFlux{2.0, 1.1},
                                                BrokenPowerLawFlux{0.5, 3.0, 0.8, 1.7},
                                                DoublePowerLawFlux{0.1, 1.0, 0.6, 2.2}};
    for (const FluxDistribution& law : laws) {
        CHECK(flux_of(law, 1.0) == Approx(minimum_flux(law)).epsilon(1e-13));
        CHECK(fraction_above(law, 0.5 * minimum_flux(law)) == 1.0);
        CHECK(fraction_above(law, -inf) == 1.0);
        CHECK(fraction_above(law, inf) == 0.0);
        CHECK(flux_slope(law, 0.5 * minimum_flux(law)) == 0.0);
        for (const double fraction : {0.999, 0.5, 0.1, 1e-3, 1e-9, 1e-16})
            CHECK(fraction_above(law, flux_of(law, fraction)) ==
                  Approx(fraction).epsilon(1e-12));
        for (const double flux : {2.5, 7.0, 300.0}) {
            const double h = 1e-5;
            const double numeric = -std::log(fraction_above(law, flux * std::exp(h)) /
                                             fraction_above(law, flux * std::exp(-h))) /
                                   (2.0 * h);
            CHECK(flux_slope(law, flux) == Approx(numeric).epsilon(1e-8));
        }
    }
}

TEST_CASE("a broken power law has the numbers its slopes say", "[mock]") {
    const FluxDistribution law = BrokenPowerLawFlux{1.0, 4.0, 0.5, 2.0};
    // By hand: N(>4) = 4^-0.5 = 1/2, N(>8) = 1/2 2^-2 = 1/8.
    CHECK(fraction_above(law, 4.0) == 0.5);
    CHECK(fraction_above(law, 8.0) == 0.125);
    CHECK(flux_of(law, 0.125) == Approx(8.0).epsilon(1e-15));
    CHECK(flux_of(law, 0.75) == Approx(16.0 / 9.0).epsilon(1e-15));
    CHECK(flux_slope(law, 3.999) == 0.5);
    CHECK(flux_slope(law, 4.0) == 2.0);
}

TEST_CASE("a double power law agrees with bisection on random hard cases", "[mock]") {
    Stream stream(20260817, Purpose::test, 1, 0, 0);
    for (int trial = 0; trial < 2000; ++trial) {
        DoublePowerLawFlux law;
        law.faint_slope = std::exp(-4.0 + 5.0 * uniform(stream));
        law.bright_slope = law.faint_slope + std::exp(-9.0 + 11.0 * uniform(stream));
        law.turn_flux = std::exp(-5.0 + 10.0 * uniform(stream));
        law.minimum = law.turn_flux * std::exp(-8.0 + 12.0 * uniform(stream));
        const double fraction = std::exp(-30.0 * uniform(stream));
        const long double exact = flux_by_bisection(law, fraction);
        if (!(exact < 1e80L)) continue;  // the bracket of the bisection ends there
        // ln S carries the rounding of ln N divided by the local slope.
        const double tolerance = 2e-14 * (1.0 + 4.0 / law.faint_slope);
        const auto found = static_cast<long double>(flux_of(law, fraction));
        CAPTURE(law.faint_slope, law.bright_slope, law.turn_flux, law.minimum, fraction);
        CHECK(static_cast<double>(std::abs(found / exact - 1.0L)) < tolerance);
    }
}

TEST_CASE("redshift, magnitude and size have the stated distributions", "[mock]") {
    const RedshiftDistribution redshift{0.9, 1.5};
    // P(<z) = 1 - (1+t) e^-t, t = (z/0.9)^1.5: differences at 0.4, 0.8, 1.2 (mpmath), printed
    // with 12 decimals.
    constexpr double last_decimal = 5.1e-13;
    CHECK(fraction_below(redshift, 0.4) ==
          Approx(0.036116749178).epsilon(0).margin(last_decimal));
    CHECK(fraction_below(redshift, 0.8) - fraction_below(redshift, 0.4) ==
          Approx(0.168829777334).epsilon(0).margin(last_decimal));
    CHECK(1.0 - fraction_below(redshift, 1.2) ==
          Approx(0.544659828618).epsilon(0).margin(last_decimal));
    CHECK(fraction_below(redshift, 0.0) == 0.0);
    CHECK(fraction_below(redshift, inf) == 1.0);
    CHECK(density_at(redshift, -1.0) == 0.0);
    CHECK(density_at(redshift, inf) == 0.0);
    CHECK(redshift_of(redshift, 1.0, 1.0) == 0.0);
    CHECK(redshift_of(redshift, std::exp(-0.25), std::exp(-0.75)) == Approx(0.9));

    const MagnitudeDistribution magnitude{0.5, 22.0};
    CHECK(magnitude_of(magnitude, 1.0) == 22.0);
    CHECK(magnitude_of(magnitude, 0.1) == Approx(20.0).epsilon(1e-15));
    CHECK(fraction_below(magnitude, 20.0) == Approx(0.1).epsilon(1e-14));
    CHECK(fraction_below(magnitude, inf) == 1.0);
    CHECK(fraction_below(magnitude, -inf) == 0.0);

    const SizeDistribution size{2.0, 0.6};
    CHECK(size_of(size, 0.0) == 2.0);
    CHECK(fraction_below(size, 2.0) == 0.5);
    // One standard deviation of ln s: 0.841344746068543 of a normal distribution (tables).
    CHECK(fraction_below(size, 2.0 * std::exp(0.6)) == Approx(0.841344746068543));
    CHECK(fraction_below(size, 0.0) == 0.0);
    CHECK(fraction_below(size, inf) == 1.0);
    for (const double value : {0.7, 2.0, 3.1}) {
        const double h = 1e-5;
        CHECK(density_at(size, value) ==
              Approx((fraction_below(size, value + h) - fraction_below(size, value - h)) /
                     (2.0 * h))
                  .epsilon(1e-7));
        CHECK(density_at(redshift, value) == Approx((fraction_below(redshift, value + h) -
                                                     fraction_below(redshift, value - h)) /
                                                    (2.0 * h))
                                                 .epsilon(1e-7));
    }
}
