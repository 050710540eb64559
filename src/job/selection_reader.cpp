// SPDX-License-Identifier: GPL-2.0-or-later
#include "job/selection_reader.h"

#include <fmt/format.h>

#include <algorithm>
#include <optional>

#include "job/frame_reader.h"

namespace deviascope {

namespace {

NumberRange any_or_infinite() {
    NumberRange range;
    range.infinite = true;
    return range;
}

/// Properties besides the position.
std::vector<std::string> properties(const Columns& columns) {
    std::vector<std::string> names;
    for (const auto& [property, column] : columns) {
        if (property != "lon" && property != "lat") names.push_back(property);
    }
    return names;
}

std::optional<PropertyRange> read_range(const TomlTable& select, const std::string& property) {
    const auto ends = select.numbers(property, 2, any_or_infinite());
    if (!ends) return std::nullopt;
    if ((*ends)(0) < (*ends)(1)) return PropertyRange{property, (*ends)(0), (*ends)(1)};
    select.wrong(property, "a range [low, high) with low below high");
    return std::nullopt;
}

std::optional<Exclusion> read_band(const TomlTable& table) {
    const auto width = table.number("band", inside(0, 90), required);
    return width ? std::optional(Exclusion{BandExclusion{*width}}) : std::nullopt;
}

std::optional<Exclusion> read_disc(const TomlTable& table) {
    const auto lon = table.number("lon", between(-360, 360), required);
    const auto lat = table.number("lat", between(-90, 90), required);
    const auto radius = table.number("radius", inside(0, 180), required);
    if (!lon || !lat || !radius) return std::nullopt;
    return Exclusion{DiscExclusion{*lon, *lat, *radius}};
}

std::optional<Exclusion> read_below(const TomlTable& table) {
    const auto lat = table.number("below", inside(-90, 90), required);
    return lat ? std::optional(Exclusion{BelowExclusion{*lat}}) : std::nullopt;
}

std::optional<Exclusion> read_above(const TomlTable& table) {
    const auto lat = table.number("above", inside(-90, 90), required);
    return lat ? std::optional(Exclusion{AboveExclusion{*lat}}) : std::nullopt;
}

/// The one form of region that a table has the keys of.
std::optional<Exclusion> read_region(const TomlTable& table) {
    using Reader = std::optional<Exclusion> (*)(const TomlTable&);
    std::vector<Reader> readers;
    if (table.has("band")) readers.push_back(read_band);
    const bool lon = table.has("lon"), lat = table.has("lat"), radius = table.has("radius");
    if (lon || lat || radius) readers.push_back(read_disc);
    if (table.has("below")) readers.push_back(read_below);
    if (table.has("above")) readers.push_back(read_above);
    if (readers.size() == 1) return readers.front()(table);
    table.fault_here(readers.empty() ? "no region" : "more than one region",
                     "one of band; lon, lat and radius; below; above is required",
                     readers.empty() ? "" : "write one table for each");
    return std::nullopt;
}

}  // namespace

Columns read_columns(const TomlTable& survey, Presence presence) {
    Columns columns;
    const TomlTable table = survey.table("columns");
    std::map<std::string, std::string> property_of;
    for (const char* position : {"lon", "lat"}) table.text(position, presence);
    for (const std::string& property : table.keys()) {
        columns[property] = table.text(property).value_or("");
        const auto [other, is_new] = property_of.try_emplace(columns[property], property);
        if (is_new || columns[property].empty()) continue;
        table.wrong(
            property, "each column once", fmt::format("it is {} already", other->second));
    }
    return columns;
}

bool names_property(const TomlTable& table, const std::string& key, const Columns& columns) {
    const std::vector<std::string> known = properties(columns);
    const bool is_known = std::find(known.begin(), known.end(), key) != known.end();
    if (is_known || !table.has(key)) return is_known;
    table.fault(key,
                "no such property",
                known.empty() ? "the survey's columns name none besides the position"
                              : "the survey's columns name " + listed(known, " and "),
                suggestion(key, known));
    return false;
}

std::vector<PropertyRange> read_select(const TomlTable& table, const Columns& columns) {
    std::vector<PropertyRange> ranges;
    const TomlTable select = table.table("select");
    for (const std::string& property : select.keys()) {
        const auto range = read_range(select, property);
        if (names_property(select, property, columns) && range) ranges.push_back(*range);
    }
    return ranges;
}

std::vector<Exclusion> read_exclusions(const TomlTable& survey) {
    std::vector<Exclusion> exclusions;
    for (const TomlTable& table : survey.tables("exclude")) {
        const auto frame = read_frame(table, "frame", required);
        auto region = read_region(table);
        if (!frame || !region) continue;
        region->frame = *frame;
        exclusions.push_back(*region);
    }
    return exclusions;
}

}  // namespace deviascope
