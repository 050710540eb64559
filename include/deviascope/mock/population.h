// SPDX-License-Identifier: GPL-2.0-or-later
// MOCK: beside the flow; skies with known truth
#pragma once

#include <variant>

namespace deviascope {

/// N(>S) ~ S^-slope from `minimum` on.
struct PowerLawFlux {
    double minimum = 1.0;  ///< faintest source drawn, unit of the column
    double slope = 1.0;    ///< > 0
};

/// N(>S) ~ S^-faint_slope below `break_flux`, S^-bright_slope above, continuous.
struct BrokenPowerLawFlux {
    double minimum = 1.0;       ///< faintest source drawn, unit of the column
    double break_flux = 10.0;   ///< > minimum
    double faint_slope = 1.0;   ///< > 0
    double bright_slope = 2.0;  ///< > 0
};

/// N(>S) ~ 1 / [ (S/turn_flux)^faint_slope + (S/turn_flux)^bright_slope ] from `minimum` on:
/// two power laws that turn smoothly into one another.
struct DoublePowerLawFlux {
    double minimum = 0.1;       ///< faintest source drawn, unit of the column
    double turn_flux = 1.0;     ///< > 0
    double faint_slope = 0.6;   ///< > 0, below bright_slope
    double bright_slope = 2.2;  ///< > faint_slope
};

using FluxDistribution = std::variant<PowerLawFlux, BrokenPowerLawFlux, DoublePowerLawFlux>;

/// Cumulative P(<z) = 1 - (1 + t) e^-t, t = (z / scale)^power (Gamma of shape 2 in t).
struct RedshiftDistribution {
    double scale = 0.9;  ///< > 0
    double power = 1.5;  ///< > 0
};

/// N(<m) ~ 10^(slope m) up to `limit`.
struct MagnitudeDistribution {
    double slope = 0.5;   ///< > 0, per magnitude
    double limit = 22.0;  ///< faintest source drawn, magnitudes
};

/// Log-normal angular size.
struct SizeDistribution {
    double median = 2.0;  ///< > 0, unit of the column
    double sd_ln = 0.6;   ///< > 0
};

/// Spectral index alpha, S ~ nu^-alpha, Gaussian.
struct SpectralIndexDistribution {
    double mean = 0.75;
    double sd = 0.0;  ///< 0: the same for all, and no number is drawn
};

// Inverse cumulative distributions: what turns a uniform fraction into a property. Exact in
// real numbers; accuracy a few units in the last place unless said otherwise.

/// Cosine mu of the angle to a dipole of amplitude D below which a fraction of the sources
/// lies, where the density is (1 + D mu) / 2 on -1 … 1:
///   mu = (D - 2 + 4 fraction) / (1 + sqrt((1-D)^2 + 4 D fraction)),  no cancellation at D = 0.
/// Domain: 0 <= D < 1, 0 <= fraction <= 1.
double polar_cosine_of(double dipole, double fraction);

/// Flux above which a fraction of the drawn sources lies. Domain: 0 < fraction <= 1; 1 gives
/// `minimum`. A double power law is solved by Newton's method to 1e-14 in ln S.
double flux_of(const FluxDistribution& distribution, double fraction);
/// Fraction of the drawn sources above a flux: 1 up to `minimum`.
double fraction_above(const FluxDistribution& distribution, double flux);
/// x = - d ln N(>S) / d ln S; 0 below `minimum`, the bright slope at a break.
double flux_slope(const FluxDistribution& distribution, double flux);
double minimum_flux(const FluxDistribution& distribution);

/// A redshift from two uniform fractions in (0, 1]: t = -ln(first second) is Gamma(2).
double redshift_of(const RedshiftDistribution& distribution, double first, double second);
/// P(<z) and p(z) = dP/dz; both 0 for z <= 0.
double fraction_below(const RedshiftDistribution& distribution, double redshift);
double density_at(const RedshiftDistribution& distribution, double redshift);

/// Magnitude below which a fraction of the drawn sources lies. Domain: 0 < fraction <= 1.
double magnitude_of(const MagnitudeDistribution& distribution, double fraction);
/// Fraction of the drawn sources brighter than a magnitude: 1 from `limit` on.
double fraction_below(const MagnitudeDistribution& distribution, double magnitude);

/// Size of a standard normal deviate.
double size_of(const SizeDistribution& distribution, double deviate);
/// P(<s) and q(s) = dP/ds; both 0 for s <= 0.
double fraction_below(const SizeDistribution& distribution, double size);
double density_at(const SizeDistribution& distribution, double size);

}  // namespace deviascope
