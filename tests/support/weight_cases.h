// SPDX-License-Identifier: GPL-2.0-or-later
// Populations whose kinematic weights are known, as catalogues of values without positions.
#pragma once

#include <cmath>
#include <functional>
#include <limits>
#include <numbers>
#include <string>
#include <vector>

#include "deviascope/core/random.h"
#include "deviascope/counts/survey_input.h"
#include "deviascope/mock/population.h"

namespace deviascope::test {

/// A population, bins that select on it, and their weights.
struct WeightCase {
    std::string name;
    SurveyInput survey;            ///< select and bins; nothing else
    double alpha = 0.0;            ///< of all sources
    std::vector<double> expected;  ///< weight of each bin
    /// Values of one source, in the order of `properties`.
    std::vector<std::string> properties;
    std::function<std::vector<double>(Stream&)> draw;
};

inline SurveyInput survey_with_bins(const std::vector<std::vector<PropertyRange>>& bins,
                                    const std::vector<PropertyRange>& select = {}) {
    SurveyInput survey;
    survey.name = "dunlin";
    survey.select = select;
    for (std::size_t b = 0; b < bins.size(); ++b) {
        BinInput bin;
        bin.name = "b" + std::to_string(b);
        bin.select = bins[b];
        survey.bins.push_back(bin);
    }
    return survey;
}

/// A fraction in (0, 1].
inline double fraction(Stream& stream) {
    return 1.0 - uniform(stream);
}

inline constexpr double endless = std::numeric_limits<double>::infinity();

/// N(>S) ~ S^-1.1, alpha 0.8: 2 + x (1 + alpha) for any edges (Ellis & Baldwin 1984).
inline WeightCase power_law_case(double minimum) {
    const FluxDistribution law = PowerLawFlux{minimum, 1.1};
    return {"power law",
            survey_with_bins({{{"flux", 2.0, endless}}, {{"flux", 2.0, 5.0}}}),
            0.8,
            {3.98, 3.98},
            {"flux"},
            [law](Stream& s) { return std::vector<double>{flux_of(law, fraction(s))}; }};
}

/// N(>S) = 2 / (S^0.6 + S^2.2), alpha 0.75. Weights: the closed form 2 + (1 + alpha) [x1 N1 -
/// x2 N2] / [N1 - N2], evaluated in 15 digits outside this program.
inline WeightCase curved_flux_case(double minimum) {
    const FluxDistribution law = DoublePowerLawFlux{minimum, 1.0, 0.6, 2.2};
    return {"curved counts",
            survey_with_bins(
                {{{"flux", 0.5, 1.0}}, {{"flux", 1.0, 3.0}}, {{"flux", 3.0, endless}}}),
            0.75,
            {3.193180781283, 4.272659659853, 5.438207809096},
            {"flux"},
            [law](Stream& s) { return std::vector<double>{flux_of(law, fraction(s))}; }};
}

/// P(<z) = 1 - (1 + t) e^-t, t = (z / 0.9)^1.5, with a flux limit of x = 1.2, alpha = 0.8.
/// Weights: the closed form with both edges, as above.
inline WeightCase redshift_case(double minimum_flux) {
    const FluxDistribution law = PowerLawFlux{minimum_flux, 1.2};
    return {"redshift shells",
            survey_with_bins({{{"redshift", 0.0, 0.4}},
                              {{"redshift", 0.4, 0.8}},
                              {{"redshift", 0.8, 1.2}},
                              {{"redshift", 1.2, endless}}},
                             {{"flux", 1.0, endless}}),
            0.8,
            {13.649061240044, 8.203093961025, 5.648442604388, 1.593250639469},
            {"flux", "redshift"},
            [law](Stream& s) {
                const double flux = flux_of(law, fraction(s));
                const double first = fraction(s);
                const double second = fraction(s);
                return std::vector<double>{
                    flux, redshift_of(RedshiftDistribution{0.9, 1.5}, first, second)};
            }};
}

/// N(<m) ~ 10^(0.5 m) up to 21.5: 2 + 2.5 s (1 + alpha).
inline WeightCase magnitude_case(double alpha) {
    const MagnitudeDistribution law{0.5, 21.5};
    return {"magnitudes",
            survey_with_bins({{{"magnitude", -endless, 20.0}}}),
            alpha,
            {2.0 + 1.25 * (1.0 + alpha)},
            {"magnitude"},
            [law](Stream& s) { return std::vector<double>{magnitude_of(law, fraction(s))}; }};
}

/// Log-normal sizes, median 2, sigma_ln 0.6: 2 + [s2 q(s2) - s1 q(s1)] / N, as above.
inline WeightCase size_case() {
    return {"sizes",
            survey_with_bins({{{"size", 1.5, 3.0}}, {{"size", 1.5, endless}}}),
            0.0,
            {1.853806338249, 1.133723049936},
            {"size"},
            [](Stream& s) {
                const double deviate = normal(s);
                return std::vector<double>{size_of(SizeDistribution{2.0, 0.6}, deviate)};
            }};
}

/// Integral of a smooth function by Simpson's rule with 2000 steps.
inline double integral(const std::function<double(double)>& f, double from, double to) {
    constexpr int n = 2000;
    const double h = (to - from) / n;
    double sum = f(from) + f(to);
    for (int i = 1; i < n; ++i) sum += (i % 2 == 1 ? 4.0 : 2.0) * f(from + h * i);
    return sum * h / 3.0;
}

/// n(m) = 10^(0.6 (m-20)) / (1 + 10^(0.4 (m-20))), alpha 0.75, drawn from 15 to 24 by
/// rejection. Weights as above (log-derivative of the exact count agrees to 1e-10).
inline WeightCase curved_magnitude_case() {
    const auto density = [](double m) {
        return std::pow(10.0, 0.6 * (m - 20.0)) / (1.0 + std::pow(10.0, 0.4 * (m - 20.0)));
    };
    return {"curved magnitudes",
            survey_with_bins({{{"magnitude", 18.0, 20.0}},
                              {{"magnitude", 19.0, 21.0}},
                              {{"magnitude", 20.0, 22.0}}}),
            0.75,
            {3.9954327957, 3.6402468227, 3.3205745302},
            {"magnitude"},
            [density](Stream& s) {
                // Envelope: N ~ 10^(0.2 m), which bounds 10^(0.2 (m-20)) from above.
                for (;;) {
                    const double m = 24.0 + std::log10(fraction(s)) / 0.2;
                    const double keep = uniform(s);
                    if (m > 15.0 && keep * std::pow(10.0, 0.2 * (m - 20.0)) < density(m))
                        return std::vector<double>{m};
                }
            }};
}

/// Boxes in flux and redshift, N(>S | z) = S^-(1 + z/2) from 0.5 on, z as in the shells, alpha
/// 0.7. Weights: both pairs of edge terms, by numerical integration over the box.
inline WeightCase box_case() {
    const RedshiftDistribution shells{0.9, 1.5};
    const double alpha = 0.7;
    const auto above = [](double flux, double z) {
        return std::pow(flux / 0.5, -(1.0 + 0.5 * z));
    };
    const auto weight_of = [=](double s1, double s2, double z1, double z2) {
        const auto inside = [&](double z) {
            return density_at(shells, z) * (above(s1, z) - above(s2, z));
        };
        const auto flux_edges = [&](double z) {
            return density_at(shells, z) * (1.0 + 0.5 * z) * (above(s1, z) - above(s2, z));
        };
        const double redshift_edges = (1.0 + z2) * inside(z2) - (1.0 + z1) * inside(z1);
        return 2.0 + ((1.0 + alpha) * integral(flux_edges, z1, z2) + redshift_edges) /
                         integral(inside, z1, z2);
    };
    const auto box = [](double s1, double s2, double z1, double z2) {
        return std::vector<PropertyRange>{{"flux", s1, s2}, {"redshift", z1, z2}};
    };
    return {"boxes",
            survey_with_bins({box(1.0, 2.0, 0.4, 0.8), box(1.5, 4.0, 0.8, 1.3)}),
            alpha,
            {weight_of(1.0, 2.0, 0.4, 0.8), weight_of(1.5, 4.0, 0.8, 1.3)},
            {"flux", "redshift"},
            [shells](Stream& s) {
                const double first = fraction(s);
                const double second = fraction(s);
                const double z = redshift_of(shells, first, second);
                const double flux = 0.5 * std::pow(fraction(s), -1.0 / (1.0 + 0.5 * z));
                return std::vector<double>{flux, z};
            }};
}

}  // namespace deviascope::test
