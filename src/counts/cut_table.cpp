// SPDX-License-Identifier: GPL-2.0-or-later
#include "counts/cut_table.h"

#include <fmt/format.h>

#include "deviascope/core/error.h"

namespace deviascope {

namespace {

constexpr std::size_t no_line = static_cast<std::size_t>(-1);

}  // namespace

CutTable::CutTable(const SurveyInput& input,
                   const RowSelection& selection,
                   const SkyCuts& sky,
                   const std::vector<Duplicates>& duplicates)
    : missing(selection.properties.size(), no_line) {
    position = add_line("position missing or out of range");
    for (const ColumnRange& range : selection.survey) {
        add_missing(selection, range.property);
        select.push_back(add_line("select " + range.label));
    }
    first_sky_cut = report.cuts.size();
    for (const Exclusion& exclusion : input.exclude) add_line("exclude " + exclusion.label());
    add_line("exposure 0");
    hole = add_line("exposure 0 at the source, in a kept pixel");
    for (std::size_t property = 0; property < missing.size(); ++property)
        add_missing(selection, property);
    no_bin = add_line("in no bin");
    for (const BinInput& bin : input.bins)
        bin_exposure.push_back(
            bin.exposure ? add_line(fmt::format("exposure of bin {} 0", bin.name)) : no_line);
    for (const Duplicates& other : duplicates)
        duplicate.push_back(
            add_line(fmt::format("in {} too, within {:g} arcsec",
                                 other.survey,
                                 other.positions->radius() / radians_per_arcsec)));
    count_pixels(sky);
}

std::size_t CutTable::add_line(const std::string& name) {
    report.cuts.push_back({name, 0, 0});
    return report.cuts.size() - 1;
}

void CutTable::add_missing(const RowSelection& selection, std::size_t property) {
    if (missing[property] != no_line) return;
    missing[property] = add_line(selection.properties[property] + " missing");
}

void CutTable::count_pixels(const SkyCuts& sky) {
    for (const std::int32_t cut : sky.removed_by()) {
        ++report.pixels_total;
        if (cut == SkyCuts::kept) {
            ++report.pixels_kept;
        } else {
            ++report.cuts[first_sky_cut + static_cast<std::size_t>(cut)].pixels_removed;
        }
    }
}

CutReport CutTable::finished() const {
    std::int64_t rows = report.rows_kept;
    std::int64_t pixels = report.pixels_kept;
    for (const CutLine& line : report.cuts) {
        rows += line.rows_removed;
        pixels += line.pixels_removed;
    }
    ensure(rows == report.rows_read, "the rows of the table of cuts add up");
    ensure(pixels == report.pixels_total, "the pixels of the table of cuts add up");
    return report;
}

}  // namespace deviascope
