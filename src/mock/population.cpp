// SPDX-License-Identifier: GPL-2.0-or-later
#include "deviascope/mock/population.h"

#include <algorithm>
#include <cmath>
#include <limits>
#include <numbers>

namespace deviascope {

namespace {

double fraction_at_break(const BrokenPowerLawFlux& law) {
    return std::pow(law.break_flux / law.minimum, -law.faint_slope);
}

double flux_at(const PowerLawFlux& law, double fraction) {
    return law.minimum * std::pow(fraction, -1.0 / law.slope);
}

double flux_at(const BrokenPowerLawFlux& law, double fraction) {
    const double at_break = fraction_at_break(law);
    if (fraction > at_break) return law.minimum * std::pow(fraction, -1.0 / law.faint_slope);
    return law.break_flux * std::pow(fraction / at_break, -1.0 / law.bright_slope);
}

/// 1 / N(>S) but for a factor.
double inverse_number(const DoublePowerLawFlux& law, double flux) {
    const double ratio = flux / law.turn_flux;
    return std::pow(ratio, law.faint_slope) + std::pow(ratio, law.bright_slope);
}

/// Solves ln(e^(f x) + e^(b x)) = y for x = ln(S / turn_flux). The left side is convex and
/// increasing, so Newton's method from above the root comes down to it without overshooting.
double flux_at(const DoublePowerLawFlux& law, double fraction) {
    const double f = law.faint_slope;
    const double b = law.bright_slope;
    const double y = std::log(inverse_number(law, law.minimum) / fraction);
    double x = y > 0.0 ? y / b : y / f;
    for (int iteration = 0; iteration < 100; ++iteration) {
        const double faint_share = 1.0 / (1.0 + std::exp((b - f) * x));
        const double value = f * x - std::log(faint_share);
        const double step = (value - y) / (b - (b - f) * faint_share);
        x -= step;
        if (step <= 1e-14 * std::max(1.0, std::abs(x))) break;
    }
    return law.turn_flux * std::exp(x);
}

double above(const PowerLawFlux& law, double flux) {
    return std::pow(flux / law.minimum, -law.slope);
}
double above(const BrokenPowerLawFlux& law, double flux) {
    if (flux < law.break_flux) return std::pow(flux / law.minimum, -law.faint_slope);
    return fraction_at_break(law) * std::pow(flux / law.break_flux, -law.bright_slope);
}
double above(const DoublePowerLawFlux& law, double flux) {
    return inverse_number(law, law.minimum) / inverse_number(law, flux);
}

double slope_at(const PowerLawFlux& law, double) {
    return law.slope;
}
double slope_at(const BrokenPowerLawFlux& law, double flux) {
    return flux < law.break_flux ? law.faint_slope : law.bright_slope;
}
double slope_at(const DoublePowerLawFlux& law, double flux) {
    const double steepening =
        std::pow(flux / law.turn_flux, law.bright_slope - law.faint_slope);
    const double faint_share = 1.0 / (1.0 + steepening);
    return law.bright_slope - (law.bright_slope - law.faint_slope) * faint_share;
}

}  // namespace

double polar_cosine_of(double dipole, double fraction) {
    const double rest = 1.0 - dipole;
    const double root = std::sqrt(rest * rest + 4.0 * dipole * fraction);
    return std::clamp((dipole - 2.0 + 4.0 * fraction) / (1.0 + root), -1.0, 1.0);
}

double flux_of(const FluxDistribution& distribution, double fraction) {
    return std::visit([&](const auto& law) { return flux_at(law, fraction); }, distribution);
}

double minimum_flux(const FluxDistribution& distribution) {
    return std::visit([](const auto& law) { return law.minimum; }, distribution);
}

double fraction_above(const FluxDistribution& distribution, double flux) {
    if (!(flux > minimum_flux(distribution))) return 1.0;
    if (std::isinf(flux)) return 0.0;
    return std::visit([&](const auto& law) { return above(law, flux); }, distribution);
}

double flux_slope(const FluxDistribution& distribution, double flux) {
    if (!(flux >= minimum_flux(distribution))) return 0.0;
    return std::visit([&](const auto& law) { return slope_at(law, flux); }, distribution);
}

double redshift_of(const RedshiftDistribution& distribution, double first, double second) {
    const double t = -std::log(first * second);
    return distribution.scale * std::pow(t, 1.0 / distribution.power);
}

double fraction_below(const RedshiftDistribution& distribution, double redshift) {
    if (!(redshift > 0.0)) return 0.0;
    if (std::isinf(redshift)) return 1.0;
    const double t = std::pow(redshift / distribution.scale, distribution.power);
    return -std::expm1(std::log1p(t) - t);
}

// p(z) = power t^2 e^-t / z with t as above.
double density_at(const RedshiftDistribution& distribution, double redshift) {
    if (!(redshift > 0.0) || std::isinf(redshift)) return 0.0;
    const double t = std::pow(redshift / distribution.scale, distribution.power);
    return distribution.power * t * t * std::exp(-t) / redshift;
}

double magnitude_of(const MagnitudeDistribution& distribution, double fraction) {
    return distribution.limit + std::log10(fraction) / distribution.slope;
}

double fraction_below(const MagnitudeDistribution& distribution, double magnitude) {
    if (magnitude >= distribution.limit) return 1.0;
    return std::pow(10.0, distribution.slope * (magnitude - distribution.limit));
}

double size_of(const SizeDistribution& distribution, double deviate) {
    return distribution.median * std::exp(distribution.sd_ln * deviate);
}

double fraction_below(const SizeDistribution& distribution, double size) {
    if (!(size > 0.0)) return 0.0;
    const double deviate = std::log(size / distribution.median) / distribution.sd_ln;
    return 0.5 * std::erfc(-deviate / std::numbers::sqrt2);
}

double density_at(const SizeDistribution& distribution, double size) {
    if (!(size > 0.0) || std::isinf(size)) return 0.0;
    const double deviate = std::log(size / distribution.median) / distribution.sd_ln;
    return std::exp(-0.5 * deviate * deviate) /
           (size * distribution.sd_ln * std::sqrt(2.0 * std::numbers::pi));
}

}  // namespace deviascope
