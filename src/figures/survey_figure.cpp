// SPDX-License-Identifier: GPL-2.0-or-later
#include <fmt/format.h>
#include <fmt/ranges.h>

#include <algorithm>
#include <array>
#include <cmath>

#include "deviascope/core/physical_constants.h"
#include "figures/sheet.h"
#include "summary/rounding.h"

namespace deviascope {
namespace {

constexpr double row_height = 11.5, between = 14.0;

/// A number with its intervals, km/s.
struct Bar {
    double middle = 0.0;
    Interval band68{}, band95{};
};

constexpr std::size_t n_panels = 4;
constexpr std::array<const char*, n_panels> panel_names = {"speed", "x", "y", "z"};

/// One fit as the figure shows it.
struct FitRow {
    std::string name;
    std::size_t series = 0;
    const SurveyFit* fit = nullptr;
    std::array<Bar, n_panels> bar;
};

Bar speed_bar(const ScalarEstimate& speed) {
    const auto in_km_s = [](const Interval& c) {
        return Interval{c[0] * speed_of_light_km_s, c[1] * speed_of_light_km_s};
    };
    return {speed.median * speed_of_light_km_s,
            in_km_s(speed.interval68),
            in_km_s(speed.interval95)};
}

Bar component_bar(const VelocityGaussian& velocity, Eigen::Index axis) {
    const double mean = velocity.mean[axis] * speed_of_light_km_s;
    const double sd = std::sqrt(velocity.covariance(axis, axis)) * speed_of_light_km_s;
    return {mean, {mean - sd, mean + sd}, {mean - 2.0 * sd, mean + 2.0 * sd}};
}

FitRow row_of(const std::string& name, std::size_t series, const SurveyFit& fit) {
    FitRow row{name, series, &fit, {speed_bar(fit.speed)}};
    for (Eigen::Index axis = 0; axis < 3; ++axis)
        row.bar[std::size_t(axis) + 1] = component_bar(fit.velocity, axis);
    return row;
}

/// All together, each alone, all without each.
std::vector<FitRow> rows_of_fits(const Comparison& all) {
    std::vector<FitRow> rows{row_of("all together", 0, all.joint)};
    for (std::size_t s = 0; s < all.alone.size(); ++s)
        rows.push_back(row_of(all.alone[s].name + " alone", s + 1, all.alone[s]));
    // Of two surveys, one left out is the other alone.
    if (all.without.size() > 2)
        for (std::size_t s = 0; s < all.without.size(); ++s)
            rows.push_back(row_of("without " + all.without[s].name, s + 1, all.without[s]));
    return rows;
}

std::array<double, n_panels> reference_of(const Comparison& all) {
    const Eigen::Vector3d v = all.reference_velocity * speed_of_light_km_s;
    return {v.norm(), v[0], v[1], v[2]};
}

Scale scale_of(const std::vector<FitRow>& rows,
               std::size_t panel,
               double reference,
               double left,
               double right) {
    double lo = reference, hi = reference;
    for (const FitRow& row : rows) {
        lo = std::fmin(lo, row.bar[panel].band95[0]);
        hi = std::fmax(hi, row.bar[panel].band95[1]);
    }
    const double margin = std::max(0.06 * (hi - lo), 1.0);
    return {panel == 0 && lo - margin < 0.0 ? 0.0 : lo - margin, hi + margin, left, right};
}

void draw_bar(Drawing& drawing, const Scale& across, const Bar& bar, double y, Colour colour) {
    if (!std::isfinite(bar.middle)) return;
    const auto band = [&](const Interval& ends, double height) {
        if (std::isfinite(ends[0]) && std::isfinite(ends[1]))
            drawing.rectangle({across.at(ends[0]), y - height, across.at(ends[1]), y + height},
                              colour);
    };
    band(bar.band95, 0.6);
    band(bar.band68, 1.9);
    drawing.add(Disc{{across.at(bar.middle), y}, 1.9, palette::paper(), Stroke{0.9, colour}});
}

void draw_panel(const FigureContext& context,
                Drawing& drawing,
                const std::vector<FitRow>& rows,
                std::size_t panel,
                const Scale& across,
                double reference,
                double top) {
    const double bottom = top + double(rows.size()) * row_height;
    const double x = across.at(reference);
    drawing.line({x, top}, {x, bottom}, {rule::reference, palette::ink(), {3.0, 2.0}});
    for (std::size_t place = 0; place < rows.size(); ++place)
        draw_bar(drawing,
                 across,
                 rows[place].bar[panel],
                 top + (double(place) + 0.5) * row_height,
                 palette::series(rows[place].series));
    draw_bottom_axis(drawing, context.fonts, across, bottom);
    drawing.add(text_at({0.5 * (across.from + across.to), bottom + 2.9 * type::axis_title},
                        std::string(panel_names[panel]) + " (km/s)",
                        type::axis_title,
                        Anchor::middle));
}

std::string sigma_words(const SurveyFit& fit) {
    return std::isfinite(fit.offset.sigma) ? plain_number(fit.offset.sigma, 1) + " σ" : "–";
}

/// Where the blocks of panels stand: one under the other where the page is narrow.
struct Layout {
    double names = 0.0, levels = 0.0;  ///< widths of the columns beside the panels
    std::size_t n_columns = n_panels;
    double panel_left(const FigureContext& context, std::size_t column) const {
        return 12.0 + names + double(column) * (panel_width(context) + between);
    }
    double panel_width(const FigureContext& context) const {
        const double room = context.width() - 12.0 - names - levels - 12.0;
        return (room - between * double(n_columns - 1)) / double(n_columns);
    }
};

Layout layout_of(const FigureContext& context, const std::vector<FitRow>& rows) {
    Layout layout;
    layout.n_columns = context.width() > 400.0 ? n_panels : n_panels / 2;
    layout.levels = context.fonts.width("off by", type::tick);
    for (const FitRow& row : rows) {
        layout.names = std::max(layout.names, context.fonts.width(row.name, type::note));
        layout.levels =
            std::max(layout.levels, context.fonts.width(sigma_words(*row.fit), type::tick));
    }
    layout.names = std::min(layout.names, 0.24 * context.width());
    return layout;
}

/// One block of panels with the names of its rows; returns the place below it.
double draw_block(const FigureContext& context,
                  Drawing& drawing,
                  const std::vector<FitRow>& rows,
                  const Layout& layout,
                  std::size_t first,
                  double top) {
    const double right = context.width() - 6.0;
    drawing.add(
        text_at({right, top - 2.5}, "off by", type::tick, Anchor::end, palette::grey_text()));
    for (std::size_t place = 0; place < rows.size(); ++place) {
        const double base = top + (double(place) + 0.5) * row_height + 0.36 * type::note;
        drawing.add(
            text_at({4.0, base},
                    shortened(context.fonts, rows[place].name, type::note, layout.names + 2.0),
                    type::note));
        drawing.add(
            text_at({right, base}, sigma_words(*rows[place].fit), type::tick, Anchor::end));
    }
    const auto reference = reference_of(*context.source.comparison);
    for (std::size_t column = 0; column < layout.n_columns; ++column) {
        const std::size_t panel = first + column;
        const double left = layout.panel_left(context, column);
        draw_panel(
            context,
            drawing,
            rows,
            panel,
            scale_of(rows, panel, reference[panel], left, left + layout.panel_width(context)),
            reference[panel],
            top);
    }
    return top + double(rows.size()) * row_height + 3.4 * type::axis_title;
}

std::string csv_of(const std::vector<FitRow>& rows, const Comparison& all) {
    CsvText csv({"fit", "quantity", "unit", "middle", "low95", "low68", "high68", "high95"});
    const auto reference = reference_of(all);
    for (const FitRow& row : rows)
        for (std::size_t panel = 0; panel < n_panels; ++panel) {
            const Bar& bar = row.bar[panel];
            csv.text(row.name).text(panel_names[panel]).text("km/s").number(bar.middle);
            csv.number(bar.band95[0]).number(bar.band68[0]);
            csv.number(bar.band68[1]).number(bar.band95[1]);
            csv.end_row();
        }
    for (std::size_t panel = 0; panel < n_panels; ++panel) {
        csv.text(all.reference).text(panel_names[panel]).text("km/s").number(reference[panel]);
        csv.text("").text("").text("").text("");
        csv.end_row();
    }
    return csv.str();
}

std::vector<std::string> notes_on(const Comparison& all, const std::vector<FitRow>& rows) {
    std::vector<std::string> notes{fmt::format(
        "Dashed: {}. x, y, z: towards longitude 0°, longitude 90° and the pole ({} frame). Off "
        "by: from {}, three components together.",
        all.reference,
        name_of(all.frame),
        all.reference)};
    if (std::isfinite(all.consistency.sigma))
        notes.push_back(
            fmt::format("Of one velocity, the surveys are {} σ off (χ² {} of {} degrees).",
                        plain_number(all.consistency.sigma, 1),
                        plain_number(all.consistency.chi2, 1),
                        plain_number(all.consistency.degrees, 0)));
    std::vector<std::string> unfinished;
    for (const FitRow& row : rows)
        if (!row.fit->converged) unfinished.push_back(row.name);
    if (!unfinished.empty())
        notes.push_back(fmt::format("Not converged: {}.", fmt::join(unfinished, ", ")));
    return notes;
}

std::string words_of(const FitRow& row) {
    const Bar& speed = row.bar[0];
    const double error = half_width(speed.band68);
    return fmt::format("{}: {} ± {} km/s, {} from the reference",
                       row.name,
                       measured_number(speed.middle, error),
                       measured_number(error, error),
                       sigma_words(*row.fit));
}

}  // namespace

std::vector<Sheet> survey_sheets(const FigureContext& context) {
    if (context.source.comparison == nullptr) return {};
    const Comparison& all = *context.source.comparison;
    if (all.alone.size() < 2) return {};
    const std::vector<FitRow> rows = rows_of_fits(all);
    auto [sheet, top] = begin_sheet(context, "surveys", "The velocity, survey by survey");
    const Layout layout = layout_of(context, rows);
    double bottom = top + 1.4 * type::tick;
    for (std::size_t first = 0; first < n_panels; first += layout.n_columns)
        bottom = draw_block(context,
                            sheet.drawing,
                            rows,
                            layout,
                            first,
                            bottom + (first == 0 ? 0.0 : 2.0 * type::tick));
    bottom = draw_notes(sheet.drawing,
                        context.fonts,
                        notes_on(all, rows),
                        4.0,
                        bottom - 0.1 * type::note,
                        palette::grey_text());
    std::vector<std::string> words;
    for (const FitRow& row : rows) words.push_back(words_of(row));
    sheet.alternative = fmt::format("Velocity by survey. {}.", fmt::join(words, "; "));
    sheet.reading_aid =
        "Speed and components of the velocity that each part of the data gives, with 68 % and "
        "95 % intervals; a survey that stands apart from the others is asked about first.";
    sheet.csv = csv_of(rows, all);
    return {end_sheet(context, std::move(sheet), bottom)};
}

}  // namespace deviascope
