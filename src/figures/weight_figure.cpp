// SPDX-License-Identifier: GPL-2.0-or-later
#include <fmt/format.h>
#include <fmt/ranges.h>

#include <algorithm>
#include <cmath>

#include "figures/sheet.h"
#include "summary/rounding.h"

namespace deviascope {
namespace {

constexpr double row_height = 13.0;

/// Bars of a bin, in standard deviations of its prior about the prior's mean.
struct WeightRow {
    const BinSummary* bin = nullptr;
    std::size_t series = 1;
    double median = 0.0;
    Interval band68{}, band95{};
};

std::vector<WeightRow> rows_of_weights(const FigureContext& context) {
    const Summary& summary = context.source.summary;
    std::vector<WeightRow> rows;
    for (const BinSummary& bin : summary.bins) {
        if (bin.weight.is_constant() || !(bin.weight_prior_sd > 0.0)) continue;
        const auto moved = [&](double weight) {
            return (weight - bin.weight_prior_mean) / bin.weight_prior_sd;
        };
        const auto survey =
            std::find(summary.survey_names.begin(), summary.survey_names.end(), bin.survey) -
            summary.survey_names.begin();
        rows.push_back({&bin,
                        std::size_t(survey) + 1,
                        moved(bin.weight.median),
                        {moved(bin.weight.interval68[0]), moved(bin.weight.interval68[1])},
                        {moved(bin.weight.interval95[0]), moved(bin.weight.interval95[1])}});
    }
    return rows;
}

std::string prior_words(const BinSummary& bin) {
    return measured_number(bin.weight_prior_mean, bin.weight_prior_sd) + " ± " +
           measured_number(bin.weight_prior_sd, bin.weight_prior_sd);
}

std::string posterior_words(const BinSummary& bin) {
    const double error = half_width(bin.weight.interval68);
    return measured_number(bin.weight.median, error) + " ± " + measured_number(error, error);
}

void draw_bar(Drawing& drawing,
              const Scale& across,
              const Interval& ends,
              double y,
              double height,
              Colour colour) {
    drawing.rectangle(
        {across.at(ends[0]), y - 0.5 * height, across.at(ends[1]), y + 0.5 * height}, colour);
}

/// Prior behind, posterior before it.
void draw_bars(Drawing& drawing, const Scale& across, const WeightRow& row, double y) {
    const Colour colour = palette::series(row.series);
    draw_bar(drawing, across, {-2.0, 2.0}, y, 0.72 * row_height, palette::panel());
    draw_bar(drawing, across, {-1.0, 1.0}, y, 0.72 * row_height, palette::mask());
    draw_bar(drawing, across, row.band95, y, 1.2, colour);
    draw_bar(drawing, across, row.band68, y, 4.0, colour);
    drawing.add(Disc{{across.at(row.median), y}, 1.9, palette::paper(), Stroke{0.9, colour}});
}

std::string csv_of(const std::vector<WeightRow>& rows) {
    CsvText csv({"survey",
                 "bin",
                 "prior_mean",
                 "prior_sd",
                 "median",
                 "low95",
                 "low68",
                 "high68",
                 "high95"});
    for (const WeightRow& row : rows) {
        const BinSummary& bin = *row.bin;
        csv.text(bin.survey).text(bin.bin);
        csv.number(bin.weight_prior_mean).number(bin.weight_prior_sd);
        csv.number(bin.weight.median).number(bin.weight.interval95[0]);
        csv.number(bin.weight.interval68[0]).number(bin.weight.interval68[1]);
        csv.number(bin.weight.interval95[1]);
        csv.end_row();
    }
    return csv.str();
}

}  // namespace

std::vector<Sheet> weight_sheets(const FigureContext& context) {
    const std::vector<WeightRow> rows = rows_of_weights(context);
    if (rows.empty()) return {};
    auto [sheet, top] =
        begin_sheet(context, "weights", "Kinematic weights, prior against posterior");
    Drawing& drawing = sheet.drawing;
    double names = 0.0, priors = 0.0, posteriors = 0.0, reach = 2.4;
    std::vector<std::string> labels;
    for (const WeightRow& row : rows) {
        labels.push_back(shortened(context.fonts,
                                   row.bin->survey + " " + row.bin->bin,
                                   type::note,
                                   0.27 * context.width()));
        names = std::max(names, context.fonts.width(labels.back(), type::note));
        priors = std::max(priors, context.fonts.width(prior_words(*row.bin), type::tick));
        posteriors =
            std::max(posteriors, context.fonts.width(posterior_words(*row.bin), type::tick));
        reach = std::max({reach, -row.band95[0] * 1.1, row.band95[1] * 1.1});
    }
    const double right = context.width() - 6.0;
    priors = std::max(priors, context.fonts.width("prior", type::tick));
    posteriors = std::max(posteriors, context.fonts.width("posterior", type::tick));
    const double column = right - posteriors - 8.0;
    const Scale across{-reach, reach, 8.0 + names, column - priors - 8.0};
    double y = top + 0.8 * row_height;
    drawing.add(text_at({column, y}, "prior", type::tick, Anchor::end, palette::grey_text()));
    drawing.add(
        text_at({right, y}, "posterior", type::tick, Anchor::end, palette::grey_text()));
    std::vector<std::string> words;
    const double first = y + 0.4 * row_height;
    for (std::size_t place = 0; place < rows.size(); ++place) {
        const WeightRow& row = rows[place];
        y = first + (double(place) + 0.5) * row_height;
        draw_bars(drawing, across, row, y);
        const double base = y + 0.36 * type::note;
        drawing.add(text_at({4.0, base}, labels[place], type::note));
        drawing.add(text_at({column, base}, prior_words(*row.bin), type::tick, Anchor::end));
        drawing.add(text_at({right, base}, posterior_words(*row.bin), type::tick, Anchor::end));
        words.push_back(fmt::format("{} {}: prior {}, posterior {}",
                                    row.bin->survey,
                                    row.bin->bin,
                                    prior_words(*row.bin),
                                    posterior_words(*row.bin)));
    }
    const double axis = y + 0.8 * row_height;
    draw_bottom_axis(drawing, context.fonts, across, axis);
    const double bottom = axis + 2.9 * type::axis_title;
    drawing.add(text_at({0.5 * (across.from + across.to), bottom},
                        "(weight − prior mean) / prior sd",
                        type::axis_title,
                        Anchor::middle));
    sheet.alternative =
        fmt::format("Kinematic weights of {} bins. {}.", rows.size(), fmt::join(words, "; "));
    sheet.reading_aid =
        "Grey: one and two standard deviations of the prior; coloured: 68 % and 95 % of the "
        "posterior. A weight pulled far off its prior is one that the counts dispute.";
    sheet.csv = csv_of(rows);
    return {end_sheet(context, std::move(sheet), bottom + 2.0)};
}

}  // namespace deviascope
