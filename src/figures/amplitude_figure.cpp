// SPDX-License-Identifier: GPL-2.0-or-later
#include <fmt/format.h>
#include <fmt/ranges.h>

#include <algorithm>
#include <cmath>

#include "deviascope/core/physical_constants.h"
#include "figures/scalar.h"

namespace deviascope {
namespace {

/// Density of an amplitude under a prior alone, in the unit of the scalar.
class PriorCurve {
  public:
    PriorCurve(const VectorPrior& prior, std::size_t vector, double scale, std::uint64_t seed)
        : prior_(prior), scale_(scale) {
        if (!std::holds_alternative<GaussianPrior>(prior.kind())) return;
        std::vector<double> lengths;
        constexpr std::uint64_t n_draws = 20000;
        for (std::uint64_t draw = 0; draw < n_draws; ++draw) {
            Stream stream(seed, Purpose::prior_draw, vector, draw, 1);
            lengths.push_back(prior.draw(stream).norm() * scale);
        }
        drawn_ = line_density(lengths, double(n_draws), {0.0, scale});
    }

    double at(double value) const {
        const double length = value / scale_;
        if (const auto* ball = std::get_if<UniformVectorPrior>(&prior_.kind()))
            return length > ball->max ? 0.0
                                      : 3.0 * length * length / std::pow(ball->max, 3) / scale_;
        if (const auto* flat = std::get_if<UniformAmplitudePrior>(&prior_.kind()))
            return length > flat->max ? 0.0 : 1.0 / flat->max / scale_;
        if (const auto* axis = std::get_if<AxisPrior>(&prior_.kind()))
            return length > axis->max ? 0.0 : 1.0 / axis->max / scale_;
        return drawn_.at(value);
    }

  private:
    const VectorPrior& prior_;
    double scale_;
    LineDensity drawn_;
};

/// One panel's worth.
struct Panel {
    Scalar scalar;
    PriorCurve prior;
    std::optional<double> reference;  ///< speed of the CMB prior
};

/// Values shown: the posterior with a margin, and the reference where it is not too far off.
Interval range_of(const Panel& panel) {
    const ScalarEstimate& estimate = panel.scalar.estimate;
    const double width = estimate.interval95[1] - estimate.interval95[0];
    double lo = estimate.interval95[0] - 0.45 * width;
    double hi = estimate.interval95[1] + 0.45 * width;
    if (panel.reference && *panel.reference > lo - 3.0 * width &&
        *panel.reference < hi + 3.0 * width) {
        lo = std::min(lo, *panel.reference - 0.15 * width);
        hi = std::max(hi, *panel.reference + 0.15 * width);
    }
    if (panel.scalar.is_one_sided || lo < 0.15 * (hi - lo)) lo = 0.0;
    return {lo, hi};
}

void draw_reference(const FigureContext& context,
                    Drawing& drawing,
                    const Scale& across,
                    double reference,
                    double top,
                    double bottom) {
    const double shown = std::clamp(reference, across.lo, across.hi);
    const double x = across.at(shown);
    const bool on_left = x < 0.5 * (across.from + across.to);
    const std::string words = fmt::format("CMB {}", plain_number(reference, 0));
    const double w = context.fonts.width(words, type::tick);
    if (shown == reference)
        drawing.line({x, bottom}, {x, top}, {rule::reference, palette::ink(), {3.0, 2.0}});
    const std::string label = shown == reference ? words
                              : on_left          ? "◂ " + words
                                                 : words + " ▸";
    const double at =
        on_left ? std::min(x + 3.0, across.to - w) : std::max(x - 3.0, across.from + w);
    Text text = text_at(
        {at, top + type::tick}, label, type::tick, on_left ? Anchor::start : Anchor::end);
    text.halo = 1.6;
    drawing.add(text);
}

void draw_panel(const FigureContext& context, Drawing& drawing, const Panel& panel, Box box) {
    const Scalar& scalar = panel.scalar;
    // The value stands above the curve, right-aligned; a line of its own keeps it free.
    Text value = text_at({box.right, box.top + type::note}, "", type::note, Anchor::end);
    value.runs = scalar.value_text();
    for (Run& run : value.runs) run.face = Face::semibold;
    drawing.add(value);
    box.top += 1.5 * type::note;
    const Interval range = range_of(panel);
    const Scale across{range[0], range[1], box.left, box.right};
    const Scale up{0.0, 1.06 * panel.scalar.density.peak(), box.bottom, box.top};
    const Colour colour = palette::series(scalar.series);
    Clip clip{Drawing::edge_of({box.left, box.top - 2.0, box.right, box.bottom}), {}};
    const auto area = [&](const Interval& interval) {
        return area_under(panel.scalar.density, interval, across, up);
    };
    clip.content.push_back(
        Shape{{area(scalar.estimate.interval95)}, palette::fill95(scalar.series)});
    clip.content.push_back(
        Shape{{area(scalar.estimate.interval68)}, palette::fill68(scalar.series)});
    Polyline prior, curve;
    for (int step = 0; step <= 160; ++step) {
        const double x = range[0] + (range[1] - range[0]) * step / 160.0;
        prior.point.push_back({across.at(x), up.at(std::min(panel.prior.at(x), 2.0 * up.hi))});
    }
    for (std::size_t node = 0; node < panel.scalar.density.place.size(); ++node)
        curve.point.push_back({across.at(panel.scalar.density.place[node]),
                               up.at(panel.scalar.density.density[node])});
    clip.content.push_back(
        Shape{{prior}, std::nullopt, Stroke{0.9, palette::prior(), {1.5, 1.5}}});
    clip.content.push_back(Shape{{curve}, std::nullopt, Stroke{rule::curve, colour}});
    drawing.add(std::move(clip));
    if (!scalar.is_one_sided) {
        const double x = across.at(scalar.estimate.median);
        drawing.line({x, box.bottom},
                     {x, up.at(panel.scalar.density.at(scalar.estimate.median))},
                     {1.0, palette::paper()});
    }
    if (panel.reference)
        draw_reference(context, drawing, across, *panel.reference, box.top, box.bottom);
    draw_bottom_axis(drawing, context.fonts, across, box.bottom);
    const std::string title = scalar.words + " (" + scalar.unit + ")";
    drawing.add(text_at({0.5 * (box.left + box.right), box.bottom + 2.9 * type::axis_title},
                        shortened(context.fonts, title, type::axis_title, box.width()),
                        type::axis_title,
                        Anchor::middle));
}

std::vector<Panel> panels_of(const FigureContext& context) {
    std::vector<Panel> panels;
    for (const VectorSeries& series : vector_series(context.source)) {
        if (!series.parameter->amplitude_free) continue;
        Scalar scalar = amplitude_scalar(context, series);
        if (!(scalar.estimate.sd > 0.0)) continue;
        PriorCurve prior(context.source.space.vector_prior(series.index),
                         series.index,
                         scalar.scale,
                         context.source.seed);
        std::optional<double> reference;
        if (series.is_velocity())
            reference = context.source.cmb_velocity.norm() * speed_of_light_km_s;
        panels.push_back({std::move(scalar), std::move(prior), reference});
    }
    return panels;
}

std::string csv_of(const std::vector<Panel>& panels) {
    CsvText csv({"scalar", "unit", "what", "value", "posterior_density", "prior_density"});
    for (const Panel& panel : panels) {
        const auto add = [&](const char* what, double x) {
            csv.text(panel.scalar.name).text(panel.scalar.unit).text(what).number(x);
            csv.number(panel.scalar.density.at(x)).number(panel.prior.at(x));
            csv.end_row();
        };
        for (const Mark& mark : marks_of(panel.scalar)) add(mark.name, mark.value);
        if (panel.reference) add("CMB", *panel.reference);
        for (const double x : panel.scalar.density.place) add("curve", x);
    }
    return csv.str();
}

}  // namespace

std::vector<Sheet> amplitude_sheets(const FigureContext& context) {
    const std::vector<Panel> panels = panels_of(context);
    if (panels.empty()) return {};
    auto [sheet, top] = begin_sheet(context, "amplitudes", "Speed and amplitudes");
    constexpr double height = 78.0, gap = 16.0, below = 3.6 * type::axis_title;
    const std::size_t most = context.width() > 380.0 ? 3 : context.width() > 300.0 ? 2 : 1;
    const std::size_t n_columns = std::min(most, panels.size());
    const double width =
        (context.width() - 20.0 - gap * double(n_columns - 1)) / double(n_columns);
    double bottom = top;
    std::vector<std::string> words;
    for (std::size_t place = 0; place < panels.size(); ++place) {
        const double left = 10.0 + double(place % n_columns) * (width + gap);
        const double panel_top = top + 3.0 + double(place / n_columns) * (height + below + 6.0);
        draw_panel(context,
                   sheet.drawing,
                   panels[place],
                   {left, panel_top, left + width, panel_top + height});
        bottom = panel_top + height + below;
        words.push_back(panels[place].scalar.words + " " + panels[place].scalar.value_words());
    }
    bottom = draw_notes(sheet.drawing,
                        context.fonts,
                        {"Areas: 68 and 95 % intervals. Dotted: the prior alone. Under a flat "
                         "vector prior an amplitude carries the volume factor r²."},
                        10.0,
                        bottom,
                        palette::grey_text());
    sheet.alternative = fmt::format("Posterior densities: {}.", fmt::join(words, "; "));
    sheet.reading_aid =
        "Posterior density of each amplitude with its 68 % and 95 % intervals; dotted, what "
        "the prior alone says: where the two look alike, the data have said little.";
    sheet.csv = csv_of(panels);
    return {end_sheet(context, std::move(sheet), bottom)};
}

}  // namespace deviascope
