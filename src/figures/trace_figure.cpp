// SPDX-License-Identifier: GPL-2.0-or-later
#include <fmt/format.h>

#include <algorithm>
#include <array>
#include <cmath>

#include "deviascope/core/grouped_number.h"
#include "deviascope/core/physical_constants.h"
#include "figures/sheet.h"

namespace deviascope {
namespace {

constexpr double row_height = 44.0, row_gap = 8.0, left = 36.0, margin = 74.0;
constexpr Eigen::Index most_columns = 240;
constexpr std::size_t most_rows = 12, n_walkers_shown = 4;

/// All walkers at one place of the run.
struct Spread {
    double step = 0.0;
    double median = 0.0;
    Interval band68{}, band95{};
    std::array<double, n_walkers_shown> walker{};
};

/// A scalar along the run.
struct Trace {
    const ScalarDiagnostics* diagnostics = nullptr;
    double scale = 1.0;
    std::string unit;
    std::size_t series = 0;
    std::vector<Spread> warm_up, stored;
};

/// Walkers that are drawn one by one: evenly among all.
Eigen::Index shown_walker(const Draws& draws, std::size_t which) {
    const Eigen::Index n = draws.n_replicates * draws.n_walkers;
    return static_cast<Eigen::Index>(which) * n / static_cast<Eigen::Index>(n_walkers_shown);
}

double value_in(const MonitoredScalar& scalar,
                const Draws& draws,
                Eigen::Index row,
                Eigen::Index walker) {
    return scalar.value(draws.row_of(row, walker / draws.n_walkers, walker % draws.n_walkers));
}

/// Rows first … last-1 together.
Spread spread_of(const MonitoredScalar& scalar,
                 double scale,
                 const Draws& draws,
                 Eigen::Index first,
                 Eigen::Index last) {
    const Eigen::Index n = draws.n_replicates * draws.n_walkers;
    std::vector<double> values;
    // All walkers, in so many rows that there are about 2,000 values: the ends of the bands
    // move by a hair only.
    const Eigen::Index stride = std::max<Eigen::Index>(1, (last - first) * n / 2000);
    for (Eigen::Index row = first; row < last; row += stride)
        for (Eigen::Index walker = 0; walker < n; ++walker)
            values.push_back(scale * value_in(scalar, draws, row, walker));
    std::sort(values.begin(), values.end());
    const auto band = [&](double probability) {
        return Interval{quantile_of(values, 0.5 - 0.5 * probability),
                        quantile_of(values, 0.5 + 0.5 * probability)};
    };
    Spread spread{0.0, median_of(values), band(level68), band(level95), {}};
    for (std::size_t which = 0; which < n_walkers_shown; ++which)
        spread.walker[which] =
            scale * value_in(scalar, draws, last - 1, shown_walker(draws, which));
    return spread;
}

template <class StepOf>
std::vector<Spread> spreads_of(const MonitoredScalar& scalar,
                               double scale,
                               const Draws& draws,
                               Eigen::Index n_columns,
                               const StepOf& step_of) {
    std::vector<Spread> spreads;
    const Eigen::Index n = std::min(n_columns, draws.n_rows);
    for (Eigen::Index column = 0; column < n; ++column) {
        const Eigen::Index first = column * draws.n_rows / n;
        const Eigen::Index last = (column + 1) * draws.n_rows / n;
        spreads.push_back(spread_of(scalar, scale, draws, first, last));
        spreads.back().step = 0.5 * (step_of(first) + step_of(last - 1));
    }
    return spreads;
}

double step_of_row(const Chain& chain, Eigen::Index row) {
    return double(chain.outcome.discarded) +
           double(chain.outcome.store_every) * double(row + 1);
}

/// The velocity's components and every amplitude, and the scalar that moved worst.
std::vector<MonitoredScalar> shown_scalars(const FigureContext& context) {
    const Chain& chain = context.source.chain;
    const auto all = monitored_scalars(chain.parameters, chain.vectors);
    const auto& scalars = context.source.summary.sampling.scalars;
    const auto worst =
        std::min_element(scalars.begin(), scalars.end(), [](const auto& a, const auto& b) {
            return a.effective_draws() < b.effective_draws();
        });
    std::vector<MonitoredScalar> shown;
    for (const MonitoredScalar& scalar : all) {
        const bool of_velocity = scalar.kind == MonitoredScalar::Kind::parameter &&
                                 scalar.name.starts_with("velocity.");
        const bool is_worst = worst != scalars.end() && scalar.name == worst->name;
        if (of_velocity || is_worst || scalar.kind == MonitoredScalar::Kind::amplitude)
            shown.push_back(scalar);
    }
    if (shown.empty()) shown = all;
    // Too many: those at the end go, but never the worst.
    while (shown.size() > most_rows) {
        const bool worst_is_last = worst != scalars.end() && shown.back().name == worst->name;
        shown.erase(worst_is_last ? shown.end() - 2 : shown.end() - 1);
    }
    return shown;
}

std::size_t series_of(const Chain& chain, const std::string& name) {
    for (std::size_t index = 0; index < chain.vectors.size(); ++index)
        if (name.starts_with(chain.vectors[index].name + ".")) return index;
    // A weight or monopole has the colour of its survey's dipole.
    for (std::size_t survey = 0; survey < chain.counts.surveys.size(); ++survey)
        if (name.find("." + chain.counts.surveys[survey].name + ".") != std::string::npos)
            return std::min(survey + 1, chain.vectors.size() - 1);
    return 0;
}

/// Velocities and dipoles in thousandths.
void set_unit(Trace& trace, const MonitoredScalar& scalar, const Chain& chain) {
    if (scalar.name.starts_with("weight.") || scalar.name.starts_with("monopole.") ||
        scalar.kind == MonitoredScalar::Kind::direction)
        return;
    trace.scale = 1000.0;
    trace.unit = series_of(chain, scalar.name) == 0 ? "10⁻³ c" : "10⁻³";
}

std::vector<Trace> traces_of(const FigureContext& context) {
    const Chain& chain = context.source.chain;
    std::vector<Trace> traces;
    for (const MonitoredScalar& scalar : shown_scalars(context)) {
        Trace trace;
        for (const ScalarDiagnostics& one : context.source.summary.sampling.scalars)
            if (one.name == scalar.name) trace.diagnostics = &one;
        if (trace.diagnostics == nullptr) continue;  // it is constant
        trace.series = series_of(chain, scalar.name);
        set_unit(trace, scalar, chain);
        const auto& step = chain.warm_up.step;
        trace.warm_up = spreads_of(
            scalar, trace.scale, chain.warm_up.buffer, most_columns / 4, [&](Eigen::Index row) {
                return double(step[std::size_t(row)]);
            });
        trace.stored =
            spreads_of(scalar, trace.scale, chain.draws, most_columns, [&](Eigen::Index row) {
                return step_of_row(chain, row);
            });
        traces.push_back(std::move(trace));
    }
    return traces;
}

/// Ends of the values: the stored part decides; the warm-up may run off the panel.
Interval range_of(const Trace& trace) {
    Interval range{trace.stored.front().band95};
    for (const Spread& spread : trace.stored) {
        range[0] = std::min(range[0], spread.band95[0]);
        range[1] = std::max(range[1], spread.band95[1]);
        for (const double value : spread.walker) {
            range[0] = std::min(range[0], value);
            range[1] = std::max(range[1], value);
        }
    }
    const double width = std::max(range[1] - range[0], 1e-12);
    return {range[0] - 0.06 * width, range[1] + 0.06 * width};
}

void draw_spreads(Clip& clip,
                  const std::vector<Spread>& spreads,
                  std::size_t series,
                  const Scale& across,
                  const Scale& up) {
    if (spreads.size() < 2) return;
    const Colour colour = palette::series(series);
    const auto band = [&](Interval Spread::*ends) {
        std::vector<Point> lower, upper;
        for (const Spread& one : spreads) {
            lower.push_back({across.at(one.step), up.at((one.*ends)[0])});
            upper.push_back({across.at(one.step), up.at((one.*ends)[1])});
        }
        return area_between(upper, lower);
    };
    clip.content.push_back(Shape{{band(&Spread::band95)}, colour.with_alpha(0.18)});
    clip.content.push_back(Shape{{band(&Spread::band68)}, colour.with_alpha(0.30)});
    Shape walkers{{}, std::nullopt, Stroke{0.4, palette::grey_text().with_alpha(0.7)}};
    for (std::size_t which = 0; which < n_walkers_shown; ++which) {
        Polyline line;
        for (const Spread& one : spreads)
            line.point.push_back({across.at(one.step), up.at(one.walker[which])});
        walkers.pieces.push_back(std::move(line));
    }
    clip.content.push_back(walkers);
    Polyline median;
    for (const Spread& one : spreads)
        median.point.push_back({across.at(one.step), up.at(one.median)});
    clip.content.push_back(Shape{{median}, std::nullopt, Stroke{rule::curve, colour}});
}

void draw_numbers(Drawing& drawing, const ScalarDiagnostics& scalar, double x, double top) {
    const std::string effective = std::isfinite(scalar.effective_draws())
                                      ? grouped(std::int64_t(scalar.effective_draws()))
                                      : "–";
    const double step = 1.3 * type::tick;
    const std::array<std::string, 3> lines = {
        "R-hat " + number_or_dash(scalar.worst_rhat(), 3),
        "τ " + number_or_dash(scalar.autocorrelation_steps, 1) + " steps",
        "n eff " + effective};
    for (std::size_t line = 0; line < lines.size(); ++line)
        drawing.add(text_at({x, top + (1.0 + double(line)) * step + 3.0},
                            lines[line],
                            type::tick,
                            Anchor::start,
                            palette::grey_text()));
}

void draw_row(const FigureContext& context,
              Drawing& drawing,
              const Trace& trace,
              const Box& box,
              const Scale& across,
              double end_of_warm_up) {
    const Interval range = range_of(trace);
    const Scale up{range[0], range[1], box.bottom, box.top};
    drawing.rectangle({box.left, box.top, across.at(end_of_warm_up), box.bottom},
                      palette::tile());
    Clip clip{Drawing::edge_of(box), {}};
    draw_spreads(clip, trace.warm_up, trace.series, across, up);
    draw_spreads(clip, trace.stored, trace.series, across, up);
    drawing.add(std::move(clip));
    draw_left_axis(drawing, context.fonts, up, box.left);
    draw_numbers(drawing, *trace.diagnostics, box.right + 5.0, box.top);
    Text name = text_at(
        {box.left + 3.0, box.top + type::tick + 0.5},
        shortened(context.fonts,
                  trace.diagnostics->name + (trace.unit.empty() ? "" : " (" + trace.unit + ")"),
                  type::tick,
                  box.width() - 6.0),
        type::tick);
    name.halo = 1.8;
    drawing.add(name);
}

std::string csv_of(const std::vector<Trace>& traces) {
    CsvText csv({"scalar",
                 "unit",
                 "part",
                 "step",
                 "median",
                 "low95",
                 "low68",
                 "high68",
                 "high95",
                 "walker_a",
                 "walker_b",
                 "walker_c",
                 "walker_d"});
    for (const Trace& trace : traces)
        for (const auto* part : {&trace.warm_up, &trace.stored})
            for (const Spread& one : *part) {
                csv.text(trace.diagnostics->name).text(trace.unit);
                csv.text(part == &trace.stored ? "stored" : "warm-up").number(one.step);
                csv.number(one.median).number(one.band95[0]).number(one.band68[0]);
                csv.number(one.band68[1]).number(one.band95[1]);
                for (const double value : one.walker) csv.number(value);
                csv.end_row();
            }
    return csv.str();
}

}  // namespace

std::vector<Sheet> trace_sheets(const FigureContext& context) {
    const std::vector<Trace> traces = traces_of(context);
    if (traces.empty()) return {};
    const Chain& chain = context.source.chain;
    auto [sheet, top] = begin_sheet(context, "traces", "Traces of the sampler");
    const double last = step_of_row(chain, chain.draws.n_rows - 1);
    const Scale across{0.0, last, left, context.width() - margin};
    Box box{left, top + 3.0, across.to, top + 3.0 + row_height};
    for (const Trace& trace : traces) {
        draw_row(context, sheet.drawing, trace, box, across, double(chain.outcome.discarded));
        box.top += row_height + row_gap;
        box.bottom += row_height + row_gap;
    }
    const double axis = box.top - row_gap + 3.0;
    draw_bottom_axis(sheet.drawing, context.fonts, across, axis);
    double bottom = axis + 3.0 * type::axis_title;
    sheet.drawing.add(text_at({0.5 * (across.from + across.to), bottom - 1.0},
                              "step of each walker",
                              type::axis_title,
                              Anchor::middle));
    const SamplingSummary& sampling = context.source.summary.sampling;
    sheet.alternative = fmt::format(
        "Traces of {} scalars over {} steps, the first {} of them discarded. Worst R-hat over "
        "walkers {}, over replicates {}; fewest effective draws {}; longest correlation {} "
        "steps.",
        traces.size(),
        grouped(sampling.outcome.steps),
        grouped(sampling.outcome.discarded),
        number_or_dash(sampling.walker_rhat_max, 3),
        number_or_dash(sampling.replicate_rhat_max, 4),
        number_or_dash(sampling.effective_draws_min, 0),
        number_or_dash(sampling.autocorrelation_steps_max, 1));
    sheet.reading_aid =
        "Median over all walkers with the bands that hold 68 % and 95 % of them, and four "
        "single walkers; shaded: warm-up, discarded. Level bands and R-hat near 1 are what one "
        "wants.";
    sheet.csv = csv_of(traces);
    return {end_sheet(context, std::move(sheet), bottom)};
}

}  // namespace deviascope
