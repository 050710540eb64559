// SPDX-License-Identifier: GPL-2.0-or-later
#include <fmt/format.h>
#include <fmt/ranges.h>

#include <algorithm>
#include <array>
#include <cmath>

#include "figures/sheet.h"

namespace deviascope {
namespace {

constexpr double row_height = 21.0;

/// Differences of ln evidence on a line that is even near 0 and logarithmic far from it.
struct EvidenceScale {
    Scale stretched;
    static double stretch(double difference) { return std::asinh(0.5 * difference); }
    double at(double difference) const { return stretched.at(stretch(difference)); }
};

/// One hypothesis as the figure shows it: how far its ln evidence lies below the best one's.
struct EvidenceRow {
    const HypothesisResult* one = nullptr;
    double below = 0.0;
    std::vector<double> other_widths;  ///< the same with priors of other widths
    std::string grade;                 ///< of the evidence against it; `best`
    std::string priors;
};

std::vector<EvidenceRow> rows_of_evidence(const Comparison& all) {
    std::vector<EvidenceRow> rows;
    if (all.hypotheses.empty()) return rows;
    const HypothesisResult& best = all.hypotheses[best_hypothesis(all.hypotheses)];
    const double top = best.evidence.bridge.value;
    for (const HypothesisResult& one : all.hypotheses) {
        if (!std::isfinite(one.evidence.bridge.value)) continue;
        EvidenceRow row{&one, top - one.evidence.bridge.value, {}, "best", ""};
        if (&one != &best) row.grade = grade_of(row.below);
        row.priors = one.velocity + "; " + one.intrinsic;
        for (const PriorWidth& width : one.prior_width)
            if (std::isfinite(width.log_evidence.value))
                row.other_widths.push_back(top - width.log_evidence.value);
        rows.push_back(std::move(row));
    }
    return rows;
}

std::string evidence_words(const HypothesisResult& one) {
    // A hundredth of ln evidence says nothing to anybody.
    const LogEvidence& found = one.evidence.bridge;
    const std::string value = plain_number(found.value, 2);
    return found.error >= 0.005 ? value + " ± " + plain_number(found.error, 2) : value;
}

Interval range_of(const std::vector<EvidenceRow>& rows) {
    Interval range{0.0, 6.0};
    for (const EvidenceRow& row : rows) {
        const double error = std::fmax(row.one->evidence.bridge.error, 0.0);
        range[0] = std::min(range[0], 1.1 * (row.below - error));
        range[1] = std::max(range[1], 1.3 * (row.below + error));
        for (const double other : row.other_widths) {
            range[0] = std::min(range[0], 1.3 * other);
            range[1] = std::max(range[1], 1.3 * other);
        }
    }
    return range;
}

/// The grades of Kass & Raftery as bands behind the rows, named where there is room.
void draw_grades(const FigureContext& context,
                 Drawing& drawing,
                 const EvidenceScale& across,
                 double top,
                 double bottom) {
    static constexpr std::array<double, 4> begins = {0.0, 1.0, 3.0, 5.0};
    for (std::size_t grade = 0; grade < begins.size(); ++grade) {
        const double left = across.at(begins[grade]);
        const double right =
            grade + 1 < begins.size() ? across.at(begins[grade + 1]) : across.stretched.to;
        const double dark = 0.16 + 0.22 * double(grade);
        drawing.rectangle({left, top, right, bottom}, palette::mask().with_alpha(dark));
        const std::string name = grade_of(begins[grade]);
        if (context.fonts.width(name, type::tick) < right - left - 3.0)
            drawing.add(text_at({0.5 * (left + right), top - 2.5},
                                name,
                                type::tick,
                                Anchor::middle,
                                palette::grey_text()));
    }
}

/// Ticks at the grades' ends first, then at round numbers where they have room.
void draw_evidence_axis(const FigureContext& context,
                        Drawing& drawing,
                        const EvidenceScale& across,
                        double y) {
    const Scale& scale = across.stretched;
    drawing.line({scale.from, y}, {scale.to, y}, {rule::frame, palette::ink()});
    std::vector<double> values{0.0, 1.0, 3.0, 5.0};
    for (double round = 10.0; round < 1e7; round *= 10.0)
        values.insert(values.end(), {round, 3.0 * round, -round, -3.0 * round});
    values.insert(values.end(), {-1.0, -3.0});
    std::vector<Box> taken;
    for (const double value : values) {
        const double x = across.at(value);
        if (x < scale.from - 0.01 || x > scale.to + 0.01) continue;
        const Text label = text_at({x, y + rule::tick_length + type::tick + 0.5},
                                   plain_number(value, 0),
                                   type::tick,
                                   Anchor::middle);
        const Box box = box_of(label, context.fonts).grown(2.0);
        if (std::ranges::any_of(taken, [&](const Box& other) { return box.overlaps(other); }))
            continue;
        taken.push_back(box);
        drawing.line({x, y}, {x, y + rule::tick_length}, {rule::tick, palette::ink()});
        drawing.add(label);
    }
}

void draw_row(const FigureContext& context,
              Drawing& drawing,
              const EvidenceScale& across,
              const EvidenceRow& row,
              double y) {
    const double room = across.stretched.from - 12.0;
    drawing.add(text_at({4.0, y - 0.12 * row_height + 0.3 * type::note},
                        shortened(context.fonts, row.one->name, type::note, room),
                        type::note));
    drawing.add(text_at({4.0, y + 0.28 * row_height + 0.3 * type::tick},
                        shortened(context.fonts, row.priors, type::tick, room),
                        type::tick,
                        Anchor::start,
                        palette::grey_text()));
    for (const double other : row.other_widths)
        drawing.line({across.at(other), y - 4.5},
                     {across.at(other), y + 4.5},
                     {0.9, palette::series(1)});
    const double x = across.at(row.below);
    const double error = row.one->evidence.bridge.error;
    if (std::isfinite(error))
        drawing.line({across.at(row.below - error), y},
                     {across.at(row.below + error), y},
                     {rule::outline68, palette::series(0)});
    drawing.add(Disc{{x, y}, 2.3, palette::paper(), Stroke{1.1, palette::series(0)}});
    drawing.add(text_at({drawing.width - 6.0, y + 0.36 * type::tick},
                        evidence_words(*row.one),
                        type::tick,
                        Anchor::end));
}

std::string csv_of(const std::vector<EvidenceRow>& rows) {
    CsvText csv({"hypothesis",
                 "velocity_prior",
                 "intrinsic_prior",
                 "widened_vector",
                 "width_factor",
                 "ln_evidence",
                 "error"});
    for (const EvidenceRow& row : rows) {
        const HypothesisResult& one = *row.one;
        const auto line = [&](const std::string& vector, double factor, LogEvidence found) {
            csv.text(one.name).text(one.velocity).text(one.intrinsic).text(vector);
            csv.number(factor).number(found.value).number(found.error);
            csv.end_row();
        };
        line("", 1.0, one.evidence.bridge);
        for (const PriorWidth& width : one.prior_width)
            line(width.vector, width.factor, width.log_evidence);
    }
    return csv.str();
}

std::string words_of(const EvidenceRow& row) {
    return fmt::format(
        "{}: ln evidence {}, {}",
        row.one->name,
        evidence_words(*row.one),
        row.grade == "best"
            ? "the largest"
            : row.grade + " against it, " + plain_number(row.below, 1) + " below the best");
}

std::vector<std::string> notes_on(const Comparison& all, const std::vector<EvidenceRow>& rows) {
    std::vector<std::string> notes{
        "Under each name, its priors of velocity and intrinsic dipole. Shades: evidence "
        "undecided below 1, positive below 3, strong below 5, else very strong."};
    if (std::ranges::any_of(rows, [](const auto& row) { return !row.other_widths.empty(); }))
        notes.emplace_back(
            "Circles: the job's priors. Strokes: one prior three times as wide, or narrow.");
    std::vector<std::string> unfinished, unknown;
    for (const HypothesisResult& one : all.hypotheses) {
        if (!one.converged) unfinished.push_back(one.name);
        if (!std::isfinite(one.evidence.bridge.value)) unknown.push_back(one.name);
    }
    if (!unknown.empty())
        notes.push_back(fmt::format("Evidence unknown: {}.", fmt::join(unknown, ", ")));
    if (!unfinished.empty())
        notes.push_back(fmt::format("Not converged: {}.", fmt::join(unfinished, ", ")));
    return notes;
}

}  // namespace

std::vector<Sheet> hypothesis_sheets(const FigureContext& context) {
    if (context.source.comparison == nullptr) return {};
    const std::vector<EvidenceRow> rows = rows_of_evidence(*context.source.comparison);
    if (rows.empty()) return {};
    auto [sheet, top] = begin_sheet(context, "hypotheses", "Hypotheses by their evidence");
    Drawing& drawing = sheet.drawing;
    const std::string column = "ln evidence";
    double names = 0.0, numbers = context.fonts.width(column, type::tick);
    for (const EvidenceRow& row : rows) {
        names = std::max({names,
                          context.fonts.width(row.one->name, type::note),
                          context.fonts.width(row.priors, type::tick)});
        numbers = std::max(numbers, context.fonts.width(evidence_words(*row.one), type::tick));
    }
    names = std::min(names, 0.36 * context.width());
    const Interval range = range_of(rows);
    const EvidenceScale across{{EvidenceScale::stretch(range[0]),
                                EvidenceScale::stretch(range[1]),
                                16.0 + names,
                                context.width() - numbers - 16.0}};
    const double first = top + 1.8 * type::tick;
    const double axis = first + double(rows.size()) * row_height;
    draw_grades(context, drawing, across, first, axis);
    drawing.add(text_at({context.width() - 6.0, first - 2.5},
                        column,
                        type::tick,
                        Anchor::end,
                        palette::grey_text()));
    std::vector<std::string> words;
    for (std::size_t place = 0; place < rows.size(); ++place) {
        draw_row(
            context, drawing, across, rows[place], first + (double(place) + 0.5) * row_height);
        words.push_back(words_of(rows[place]));
    }
    draw_evidence_axis(context, drawing, across, axis);
    double bottom = axis + 2.9 * type::axis_title;
    drawing.add(text_at({0.5 * (across.stretched.from + across.stretched.to), bottom},
                        "ln evidence below the best",
                        type::axis_title,
                        Anchor::middle));
    bottom = draw_notes(drawing,
                        context.fonts,
                        notes_on(*context.source.comparison, rows),
                        4.0,
                        bottom + 2.0,
                        palette::grey_text());
    sheet.alternative = fmt::format("{}.", fmt::join(words, "; "));
    sheet.reading_aid =
        "The further right, the more the counts speak against a hypothesis; shades grade it "
        "(Kass & Raftery 1995). A stroke in another shade than its circle: the verdict hangs "
        "on that prior's width. Strokes of the best hypothesis move the margins of all others.";
    sheet.csv = csv_of(rows);
    return {end_sheet(context, std::move(sheet), bottom)};
}

}  // namespace deviascope
