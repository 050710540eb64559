// SPDX-License-Identifier: GPL-2.0-or-later
#include "counts/row_selection.h"

#include <fmt/format.h>

#include <algorithm>
#include <cmath>

#include "deviascope/core/error.h"

namespace deviascope {

std::size_t index_among(std::vector<std::string>& names, const std::string& name) {
    const auto found = std::ranges::find(names, name);
    const auto index = static_cast<std::size_t>(found - names.begin());
    if (found == names.end()) names.push_back(name);
    return index;
}

RowSelection::RowSelection(const SurveyInput& input) {
    const auto column = [&](const std::string& property) {
        const auto found = input.columns.find(property);
        ensure(found != input.columns.end(), "a selected property has a column");
        return index_among(columns, found->second);
    };
    const auto resolved = [&](const std::vector<PropertyRange>& ranges) {
        std::vector<ColumnRange> out;
        for (const PropertyRange& range : ranges) {
            const std::size_t property = index_among(properties, range.property);
            out.push_back({property,
                           column(range.property),
                           range.low,
                           range.high,
                           fmt::format("{} [{}, {})", range.property, range.low, range.high)});
        }
        return out;
    };
    for (const BinInput& bin : input.bins)
        if (!bin.counts)
            selecting_bins.push_back(static_cast<std::size_t>(&bin - input.bins.data()));
    if (selecting_bins.empty()) {
        bins.resize(input.bins.size());
        return;
    }
    lon = column("lon");
    lat = column("lat");
    survey = resolved(input.select);
    for (const BinInput& bin : input.bins) bins.push_back(resolved(bin.select));
}

Verdict judge(const std::vector<ColumnRange>& ranges,
              const TableChunk& chunk,
              std::size_t row) {
    Verdict verdict;
    for (std::size_t i = 0; i < ranges.size(); ++i) {
        const ColumnRange& range = ranges[i];
        const double value = chunk.column[range.column][row];
        if (value >= range.low && value < range.high) continue;
        if (!std::isnan(value)) return {Verdict::Kind::outside, i};
        if (verdict.kind == Verdict::Kind::inside) verdict = {Verdict::Kind::missing, i};
    }
    return verdict;
}

}  // namespace deviascope
