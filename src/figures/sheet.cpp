// SPDX-License-Identifier: GPL-2.0-or-later
#include "figures/sheet.h"

#include <fmt/format.h>

#include <cmath>

#include "summary/vector_words.h"

namespace deviascope {

std::vector<VectorSeries> vector_series(const FigureSource& source) {
    std::vector<VectorSeries> series;
    for (std::size_t index = 0; index < source.chain.vectors.size(); ++index) {
        const VectorSummary& summary =
            index == 0 ? source.summary.velocity : source.summary.intrinsic[index - 1];
        series.push_back({index, &source.chain.vectors[index], &summary, name_of(summary)});
    }
    return series;
}

Begun begin_sheet(const FigureContext& context,
                  const std::string& name,
                  const std::string& title) {
    Begun begun{{name, title, "", "", {}, ""}, 4.0};
    begun.sheet.drawing.width = context.width();
    if (context.options.bare) return begun;
    Text heading = text_at({4.0, 4.0 + type::title}, "", type::title);
    heading.runs = {{shortened(context.fonts, title, type::title * 1.06, context.width() - 8.0),
                     Face::semibold}};
    begun.sheet.drawing.add(heading);
    begun.top += 1.6 * type::title;
    return begun;
}

Sheet end_sheet(const FigureContext& context, Sheet sheet, double bottom) {
    if (!context.source.summary.sampling.converged)
        bottom = draw_notes(sheet.drawing,
                            context.fonts,
                            {"The sampling has not converged: not for publication."},
                            4.0,
                            bottom + 2.0,
                            palette::warning());
    sheet.drawing.height = std::ceil(bottom + 4.0);
    return sheet;
}

CsvText::CsvText(const std::vector<std::string>& header) {
    for (const std::string& name : header) text(name);
    end_row();
}

void CsvText::separate() {
    if (!is_first_) text_ += ',';
    is_first_ = false;
}

CsvText& CsvText::text(const std::string& cell) {
    separate();
    if (cell.find_first_of(",\"\r\n") == std::string::npos) {
        text_ += cell;
        return *this;
    }
    text_ += '"';
    for (const char letter : cell) {
        if (letter == '"') text_ += '"';
        text_ += letter;
    }
    text_ += '"';
    return *this;
}

CsvText& CsvText::number(double cell) {
    separate();
    if (std::isfinite(cell)) text_ += fmt::format("{:.10g}", cell == 0.0 ? 0.0 : cell);
    return *this;
}

void CsvText::end_row() {
    text_ += '\n';
    is_first_ = true;
}

}  // namespace deviascope
