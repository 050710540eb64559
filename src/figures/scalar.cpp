// SPDX-License-Identifier: GPL-2.0-or-later
#include "figures/scalar.h"

#include <fmt/format.h>
#include <fmt/ranges.h>

#include <cmath>

#include "deviascope/core/nearest_name.h"
#include "deviascope/core/physical_constants.h"
#include "deviascope/summary/draw_values.h"
#include "deviascope/summary/upper_limit.h"
#include "summary/rounding.h"

namespace deviascope {
namespace {

constexpr double per_thousand = 1000.0;

double furthest(const FigureContext& context, std::size_t vector) {
    return context.source.space.vector_prior(vector).furthest();
}

void finish(Scalar& scalar, const FigureContext& context) {
    for (double& value : scalar.values) value *= scalar.scale;
    scalar.estimate = estimate_of(scalar.values);
    scalar.effective = effective_values(
        scalar.name, context.source.summary.sampling.scalars, context.source.chain.draws);
    scalar.density = line_density(scalar.values, scalar.effective, scalar.support);
    const auto limits = upper_limits_of(scalar.values, scalar.density, scalar.support);
    scalar.is_one_sided = limits.has_value();
    if (!limits) return;
    scalar.estimate.interval68 = {0.0, limits->limit68};
    scalar.estimate.interval95 = {0.0, limits->limit95};
}

/// Parts of a name: `weight.dunlin.faint` has three.
std::vector<std::string> parts_of(const std::string& name) {
    std::vector<std::string> parts(1);
    for (const char letter : name)
        if (letter == '.' && parts.size() < 3)
            parts.emplace_back();
        else
            parts.back() += letter;
    return parts;
}

Line symbol_of(const std::string& letter, const std::string& index) {
    return {{letter, Face::italic}, {index, Face::regular, 0.6, -0.22}};
}

/// Words, symbol, unit and scale of a parameter.
void describe_parameter(Scalar& scalar, const FigureContext& context) {
    const auto parts = parts_of(scalar.name);
    const auto series = vector_series(context.source);
    for (const VectorSeries& one : series) {
        if (!scalar.name.starts_with(one.parameter->name + ".")) continue;
        const std::string component = scalar.name.substr(one.parameter->name.size() + 1);
        scalar.series = one.index;
        scalar.scale = per_thousand;
        scalar.unit = one.is_velocity() ? "10⁻³ c" : "10⁻³";
        const std::string owner = one.is_velocity() ? "velocity" : one.summary->name;
        scalar.words = owner + " " + component;
        scalar.symbol = symbol_of(one.is_velocity() ? "β" : "D", component);
        const double end = furthest(context, one.index);
        scalar.support = {-end * scalar.scale, end * scalar.scale};
        return;
    }
    const bool is_weight = parts[0] == "weight";
    scalar.words = fmt::format("{}", fmt::join(parts.begin(), parts.end(), " "));
    scalar.symbol = symbol_of(is_weight ? "B" : "M", "");
    scalar.unit = is_weight ? "" : "1/sr";
    if (!is_weight) scalar.support.lowest = 0.0;
}

[[noreturn]] void refuse(const std::string& name,
                         const std::string& found,
                         const std::vector<std::string>& known) {
    const std::string nearest = nearest_name(name, known);
    throw UsageError({"--parameters",
                      fmt::format("\"{}\" {}", name, found),
                      "a sampled parameter of the chain or an amplitude, such as velocity.x or "
                      "velocity.amplitude",
                      nearest.empty() || nearest == name
                          ? ""
                          : fmt::format("did you mean \"{}\"?", nearest)});
}

std::string signed_error(const char* sign, double error) {
    return sign + measured_number(std::abs(error), std::abs(error));
}

}  // namespace

Line Scalar::value_text() const {
    const double error = 0.5 * (estimate.interval68[1] - estimate.interval68[0]);
    if (is_one_sided)
        return {{"< " + measured_number(estimate.interval95[1], error) + " (95 %)"}};
    const double up = estimate.interval68[1] - estimate.median;
    const double down = estimate.median - estimate.interval68[0];
    const std::string value = measured_number(estimate.median, error);
    if (std::abs(up - down) < 0.15 * error)
        return {{value + " ± " + measured_number(error, error)}};
    return {{value + " (" + signed_error("+", up) + ", " + signed_error("−", down) + ")"}};
}

std::string Scalar::value_words() const {
    std::string text;
    for (const Run& run : value_text()) text += run.text;
    return unit.empty() ? text : text + " " + unit;
}

Scalar amplitude_scalar(const FigureContext& context, const VectorSeries& series) {
    Scalar scalar;
    scalar.name = series.parameter->name + ".amplitude";
    const bool is_velocity = series.is_velocity();
    scalar.scale = is_velocity ? speed_of_light_km_s : per_thousand;
    scalar.unit = is_velocity ? "km/s" : "10⁻³";
    scalar.words = is_velocity                     ? "speed"
                   : series.summary->name == "all" ? "intrinsic amplitude"
                                                   : "amplitude of " + series.summary->name;
    scalar.symbol = is_velocity ? Line{{"v", Face::italic}} : Line{{"D", Face::italic}};
    scalar.series = series.index;
    scalar.support = {0.0, furthest(context, series.index) * scalar.scale};
    scalar.values = amplitudes_of(rows_of(context.source.chain.draws), series.parameter->first);
    finish(scalar, context);
    return scalar;
}

Scalar scalar_named(const FigureContext& context, const std::string& name) {
    std::vector<std::string> known;
    for (const VectorSeries& one : vector_series(context.source)) {
        known.push_back(one.parameter->name + ".amplitude");
        if (name != known.back()) continue;
        if (!one.parameter->amplitude_free) refuse(name, "is fixed by its prior", known);
        return amplitude_scalar(context, one);
    }
    const auto& parameters = context.source.chain.parameters;
    for (std::size_t index = 0; index < parameters.size(); ++index) {
        known.push_back(parameters[index].name);
        if (name != known.back()) continue;
        Scalar scalar;
        scalar.name = name;
        scalar.values = column_of(rows_of(context.source.chain.draws), Eigen::Index(index));
        describe_parameter(scalar, context);
        finish(scalar, context);
        if (!(scalar.estimate.sd > 0.0)) refuse(name, "does not vary", known);
        return scalar;
    }
    refuse(name, "is not in the chain", known);
}

std::vector<Mark> marks_of(const Scalar& scalar) {
    const ScalarEstimate& estimate = scalar.estimate;
    return {{"low95", estimate.interval95[0]},
            {"low68", estimate.interval68[0]},
            {"median", estimate.median},
            {"high68", estimate.interval68[1]},
            {"high95", estimate.interval95[1]}};
}

Polyline area_under(const LineDensity& density,
                    const Interval& ends,
                    const Scale& across,
                    const Scale& up) {
    Polyline area{{}, true};
    const auto add = [&](double value, double height) {
        area.point.push_back({across.at(value), up.at(height)});
    };
    add(ends[0], 0.0);
    add(ends[0], density.at(ends[0]));
    for (std::size_t node = 0; node < density.place.size(); ++node)
        if (density.place[node] > ends[0] && density.place[node] < ends[1])
            add(density.place[node], density.density[node]);
    add(ends[1], density.at(ends[1]));
    add(ends[1], 0.0);
    return area;
}

}  // namespace deviascope
