// SPDX-License-Identifier: GPL-2.0-or-later
#include "deviascope/mock/expectation.h"

#include <cmath>
#include <numbers>

namespace deviascope {

namespace {

/// Edge terms of one property and the fraction of the population inside its range.
struct Edges {
    double term = 0.0;
    double inside = 0.0;
};

/// S n(S) = x(S) N(>S); 0 at infinity and where nothing was drawn.
double flux_edge(const FluxDistribution& law, double flux) {
    if (std::isinf(flux)) return 0.0;
    return flux_slope(law, flux) * fraction_above(law, flux);
}

Edges edges_of(const FluxDistribution& law, const KeptRange& range, double alpha) {
    return {(1.0 + alpha) * (flux_edge(law, range.low) - flux_edge(law, range.high)),
            fraction_above(law, range.low) - fraction_above(law, range.high)};
}

/// n(m) = slope ln 10 N(<m); 0 beyond the faintest source and at infinity.
double magnitude_edge(const MagnitudeDistribution& law, double magnitude) {
    if (magnitude > law.limit || std::isinf(magnitude)) return 0.0;
    return law.slope * std::numbers::ln10 * fraction_below(law, magnitude);
}

Edges edges_of(const MagnitudeDistribution& law, const KeptRange& range, double alpha) {
    const double per_factor = 2.5 / std::numbers::ln10 * (1.0 + alpha);
    return {per_factor * (magnitude_edge(law, range.high) - magnitude_edge(law, range.low)),
            fraction_below(law, range.high) - fraction_below(law, range.low)};
}

double redshift_edge(const RedshiftDistribution& law, double redshift) {
    if (std::isinf(redshift)) return 0.0;
    return (1.0 + redshift) * density_at(law, redshift);
}

Edges edges_of(const RedshiftDistribution& law, const KeptRange& range) {
    return {redshift_edge(law, range.high) - redshift_edge(law, range.low),
            fraction_below(law, range.high) - fraction_below(law, range.low)};
}

double size_edge(const SizeDistribution& law, double size) {
    if (std::isinf(size)) return 0.0;
    return size * density_at(law, size);
}

Edges edges_of(const SizeDistribution& law, const KeptRange& range) {
    return {size_edge(law, range.high) - size_edge(law, range.low),
            fraction_below(law, range.high) - fraction_below(law, range.low)};
}

bool is_pure_power_law(const MockSurvey& survey, Property property) {
    if (property == Property::magnitude) return true;
    return property == Property::flux && std::holds_alternative<PowerLawFlux>(*survey.flux);
}

bool has_closed_form(const MockSurvey& survey, const KeptRange& range) {
    if (!survey.has(range.property)) return false;
    if (std::isinf(range.low) && std::isinf(range.high)) return true;
    if (range.property == Property::alpha) return false;
    return survey.scatter_of(range.property) == 0.0 ||
           is_pure_power_law(survey, range.property);
}

Edges edges_of(const MockSurvey& survey, const KeptRange& range) {
    switch (range.property) {
        case Property::flux:
            return edges_of(*survey.flux, range, survey.alpha.mean);
        case Property::redshift:
            return edges_of(*survey.redshift, range);
        case Property::magnitude:
            return edges_of(*survey.magnitude, range, survey.alpha.mean);
        case Property::size:
            return edges_of(*survey.size, range);
        case Property::alpha:
            break;
    }
    return {0.0, 1.0};
}

}  // namespace

std::optional<double> expected_weight(const MockSurvey& survey,
                                      const std::vector<KeptRange>& ranges) {
    double weight = 2.0;
    for (const KeptRange& range : ranges) {
        if (!has_closed_form(survey, range)) return {};
        const Edges edges = edges_of(survey, range);
        if (!(edges.inside > 0.0)) return {};
        weight += edges.term / edges.inside;
    }
    return weight;
}

double expected_dispersion(const MockSurvey& survey) {
    const double m = survey.extra_components;
    return 1.0 + m + m / (1.0 + m);
}

}  // namespace deviascope
