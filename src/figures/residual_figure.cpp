// SPDX-License-Identifier: GPL-2.0-or-later
#include <fmt/format.h>

#include <cmath>

#include "deviascope/core/physical_constants.h"
#include "deviascope/summary/residuals.h"
#include "figures/sky_figures.h"
#include "summary/rounding.h"

namespace deviascope {
namespace {

constexpr double clipped_at = 3.0;  // standard deviations

/// Bar over the full width of the map, with arrow ends: values beyond it are coloured alike.
double draw_colour_bar(Drawing& drawing, const Box& map, const std::string& label) {
    const double top = map.bottom + 10.0, bottom = top + 6.0, tip = 6.0;
    const Box bar{map.left + tip, top, map.right - tip, bottom};
    constexpr int n_steps = 48;
    for (int step = 0; step < n_steps; ++step) {
        const double left = bar.left + bar.width() * step / n_steps;
        // Steps overlap by a hair, so that no seam shows between them.
        drawing.rectangle({left, top, left + bar.width() / n_steps + 0.2, bottom},
                          diverging((2.0 * step + 1.0) / n_steps - 1.0));
    }
    const double middle = 0.5 * (top + bottom);
    const Polyline left{{{bar.left, top}, {map.left, middle}, {bar.left, bottom}}, true};
    const Polyline right{{{bar.right, top}, {map.right, middle}, {bar.right, bottom}}, true};
    drawing.add(Shape{{left}, diverging(-1.0)});
    drawing.add(Shape{{right}, diverging(1.0)});
    const Scale scale{-clipped_at, clipped_at, bar.left, bar.right};
    for (const double value : {-3.0, -1.0, 0.0, 1.0, 3.0}) {
        const double x = scale.at(value);
        drawing.line({x, bottom}, {x, bottom + rule::tick_length}, {rule::tick});
        drawing.add(text_at({x, bottom + rule::tick_length + type::tick + 0.5},
                            plain_number(value, 0),
                            type::tick,
                            Anchor::middle));
    }
    const double below = bottom + rule::tick_length + 2.4 * type::tick + 2.0;
    drawing.add(text_at(
        {0.5 * (map.left + map.right), below}, label, type::axis_title, Anchor::middle));
    return below + 2.0;
}

/// Outlines with a halo: 68 % solid, 95 % dashed.
void outline(Clip& clip, const SkyPanel& panel, const VectorRegions& regions) {
    const auto add = [&](const std::vector<Polyline>& pieces, std::vector<double> dash) {
        if (pieces.empty()) return;
        clip.content.push_back(
            Shape{pieces, std::nullopt, Stroke{2.4, palette::paper().with_alpha(0.85)}});
        clip.content.push_back(
            Shape{pieces,
                  std::nullopt,
                  Stroke{1.1, palette::series(regions.series.index), std::move(dash)}});
    };
    add(panel.at(regions.region95), {3.0, 2.0});
    add(panel.at(regions.region68), {});
}

std::string csv_of(const ResidualMap& map) {
    CsvText csv({"lon_deg", "lat_deg", "counted", "expected", "residual_sigma"});
    const Pixelisation grid(map.nside);
    for (std::size_t pixel = 0; pixel < map.counted.size(); ++pixel) {
        if (std::isnan(map.residual[pixel])) continue;
        const LonLat place = lon_lat_of(grid.centre(std::int64_t(pixel)));
        csv.number(place.lon_deg)
            .number(place.lat_deg)
            .number(map.counted[pixel])
            .number(map.expected[pixel])
            .number(map.residual[pixel]);
        csv.end_row();
    }
    return csv.str();
}

/// Vectors that bear on a survey: the velocity, and its own intrinsic dipole.
std::vector<VectorSeries> vectors_of(const FigureSource& source, std::size_t survey) {
    const auto all = vector_series(source);
    if (source.space.options().intrinsic_shared) return all;
    return {all[0], all[survey + 1]};
}

/// Marks at mean directions, then their labels.
void draw_marks(const FigureContext& context,
                Drawing& drawing,
                const SkyPanel& panel,
                const std::vector<VectorSeries>& series,
                LabelPlacer& placer) {
    for (const VectorSeries& one : series)
        if (const auto pointing = pointing_of(context, one)) {
            const Point at = panel.at(*pointing);
            draw_mark(drawing, at, 4.0, one.index, palette::series(one.index));
            placer.keep_free(Box{at.x, at.y, at.x, at.y}.grown(3.0));
        }
    for (const VectorSeries& one : series)
        if (const auto pointing = pointing_of(context, one))
            placer.place(drawing,
                         panel.at(*pointing),
                         shortened(context.fonts, one.name, type::note, 0.4 * drawing.width));
}

Sheet residual_sheet(const FigureContext& context, std::size_t survey) {
    const Counts& counts = context.source.chain.counts;
    const std::string& name = counts.surveys[survey].name;
    const int nside = std::min(counts.nside, 16);
    const ResidualMap map =
        residual_map(context.source.chain, context.source.space, survey, nside);
    auto [sheet, top] = begin_sheet(context, "residuals-" + name, "Residuals of " + name);
    const double width = context.width();
    const Box box{22.0, top + 2.0, width - 6.0, top + 2.0 + 0.5 * (width - 28.0)};
    const auto series = vectors_of(context.source, survey);
    const SkyPanel panel(quiet_centre(context, series), box);
    const Pixelisation grid(nside);
    std::vector<Colour> colours;
    for (const double value : map.residual)
        colours.push_back(std::isnan(value) ? palette::mask() : diverging(value / clipped_at));
    const auto colour = [&](const Direction& direction) {
        return colours[std::size_t(grid.pixel_at(direction))];
    };
    sheet.drawing.add(Clip{panel.rim(), {panel.picture(dots_across(width), colour)}});
    const std::vector<Box> labels =
        panel.draw_graticule(sheet.drawing, context.fonts, counts.frame);
    Clip outlines{panel.rim(), {}};
    for (const VectorSeries& one : series)
        outline(outlines, panel, regions_of(context, panel.map(), one));
    if (!outlines.content.empty()) sheet.drawing.add(std::move(outlines));
    LabelPlacer placer(context.fonts, {2.0, top, width - 2.0, box.bottom});
    for (const Box& label : labels) placer.keep_free(label);
    draw_marks(context, sheet.drawing, panel, series, placer);
    const bool widened = is_dispersed(context, survey);
    double bottom = draw_colour_bar(sheet.drawing,
                                    box,
                                    widened ? "(counted − expected) / √(dispersion · expected)"
                                            : "(counted − expected) / √expected");
    bottom = draw_notes(sheet.drawing,
                        context.fonts,
                        {fmt::format("All bins of {} together, cells of {} square degrees "
                                     "(nside {}); chi-squared {} in {} cells. Grey: not "
                                     "observed.",
                                     name,
                                     short_number(full_sky_deg2 / double(grid.n_pixels())),
                                     nside,
                                     plain_number(map.chi_squared, 0),
                                     map.n_cells)},
                        8.0,
                        bottom,
                        palette::grey_text());
    sheet.alternative = fmt::format(
        "Map of the residuals of {}: counts minus what the posterior mean expects, in standard "
        "deviations. Chi-squared {} in {} cells; largest residual {}.",
        name,
        plain_number(map.chi_squared, 0),
        map.n_cells,
        plain_number(map.largest, 1));
    sheet.reading_aid =
        "What the model leaves over, in standard deviations; a large patch of one "
        "colour is something the model does not know. Colours end at ±3.";
    sheet.csv = csv_of(map);
    return end_sheet(context, std::move(sheet), bottom);
}

}  // namespace

std::vector<Sheet> residual_sheets(const FigureContext& context) {
    std::vector<Sheet> sheets;
    for (std::size_t survey = 0; survey < context.source.chain.counts.surveys.size(); ++survey)
        sheets.push_back(residual_sheet(context, survey));
    return sheets;
}

}  // namespace deviascope
