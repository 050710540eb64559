// SPDX-License-Identifier: GPL-2.0-or-later
#include "deviascope/job/variation.h"

#include <fmt/format.h>
#include <fmt/ranges.h>
#include <toml++/toml.h>

#include <charconv>
#include <cmath>
#include <optional>
#include <span>
#include <sstream>

#include "deviascope/core/error.h"

namespace deviascope {

namespace {

constexpr std::size_t most_values = 1000;

[[noreturn]] void refuse(const std::string& written, std::string found) {
    throw UsageError({"command line: --vary " + written,
                      std::move(found),
                      "PATH=FIRST:LAST:STEP or PATH=VALUE,VALUE,… is allowed",
                      "for instance survey.dunlin.exclude.band=10:30:5"});
}

std::optional<double> number_of(const std::string& text) {
    double value = 0.0;
    const auto [end, fault] = std::from_chars(text.data(), text.data() + text.size(), value);
    if (fault != std::errc() || end != text.data() + text.size()) return std::nullopt;
    return std::isfinite(value) ? std::optional(value) : std::nullopt;
}

/// Parts between separators; those inside brackets and quotes do not count.
std::vector<std::string> split(const std::string& text, char separator) {
    std::vector<std::string> parts(1);
    int depth = 0;
    bool quoted = false;
    for (const char c : text) {
        if (c == '"') quoted = !quoted;
        if (c == '[' || c == '{') ++depth;
        if (c == ']' || c == '}') --depth;
        if (c == separator && depth == 0 && !quoted)
            parts.emplace_back();
        else
            parts.back() += c;
    }
    return parts;
}

std::vector<std::string> values_of_range(const std::string& written,
                                         const std::vector<std::string>& parts) {
    const auto first = number_of(parts[0]), last = number_of(parts[1]),
               step = number_of(parts[2]);
    if (!first || !last || !step) refuse(written, "a range of other things than numbers");
    const double steps = (*last - *first) / *step;
    if (!(std::isfinite(steps) && steps >= 0.0))
        refuse(written, "a step that does not lead from the first value to the last");
    if (steps >= static_cast<double>(most_values))
        refuse(written, fmt::format("{:.0f} values", std::floor(steps) + 1.0));
    std::vector<std::string> values;
    constexpr double slack = 1e-9;
    for (int i = 0; i <= static_cast<int>(std::floor(steps + slack)); ++i) {
        // Through a decimal form, so that 0.1:0.3:0.1 says 0.3 and not 0.30000000000000004.
        const std::string text = fmt::format("{:.12g}", *first + i * *step);
        values.push_back(text);
    }
    return values;
}

/// A value as TOML writes it; a plain word is a text.
toml::table parsed_value(const std::string& value) {
    try {
        return toml::parse("value = " + value);
    } catch (const toml::parse_error&) {
        return toml::table{{"value", value}};
    }
}

/// Makes the change below a node; returns in how many places.
int change(toml::node& node, std::span<const std::string> steps, const toml::node& value);

int change_in_table(toml::table& table,
                    std::span<const std::string> steps,
                    const toml::node& value) {
    const std::string& key = steps.front();
    if (steps.size() > 1) {
        toml::node* next = table.get(key);
        return next == nullptr ? 0 : change(*next, steps.subspan(1), value);
    }
    value.visit([&](const auto& concrete) { table.insert_or_assign(key, concrete); });
    return 1;
}

int change_in_array(toml::array& array,
                    std::span<const std::string> steps,
                    const toml::node& value) {
    int places = 0;
    for (toml::node& element : array) {
        toml::table* table = element.as_table();
        if (table == nullptr) continue;
        const auto name = (*table)["name"].value<std::string>();
        if (!name && table->contains(steps.front()))
            places += change(element, steps, value);
        else if (name && steps.size() > 1 && (steps.front() == "all" || *name == steps.front()))
            places += change(element, steps.subspan(1), value);
    }
    return places;
}

int change(toml::node& node, std::span<const std::string> steps, const toml::node& value) {
    if (toml::table* table = node.as_table()) return change_in_table(*table, steps, value);
    if (toml::array* array = node.as_array()) return change_in_array(*array, steps, value);
    return 0;
}

}  // namespace

Variation parse_variation(const std::string& written) {
    const std::size_t equals = written.find('=');
    if (equals == std::string::npos || equals == 0) refuse(written, "no key and value");
    Variation variation{written.substr(0, equals), {}};
    const std::string right = written.substr(equals + 1);
    const std::vector<std::string> parts = split(right, ':');
    variation.values = parts.size() == 3 ? values_of_range(written, parts) : split(right, ',');
    for (const std::string& value : variation.values)
        if (value.empty()) refuse(written, "a value that is empty");
    if (variation.values.size() > most_values)
        refuse(written, fmt::format("{} values", variation.values.size()));
    return variation;
}

std::string varied_text(const std::string& job_text,
                        const std::string& path,
                        const std::string& value) {
    toml::table job = toml::parse(job_text);
    const toml::table holder = parsed_value(value);
    const std::vector<std::string> steps = split(path, '.');
    if (change(job, steps, *holder.get("value")) == 0)
        throw UsageError({"command line: --vary " + path,
                          "leads to nothing in the job file",
                          "steps are keys, names of surveys and bins, or all",
                          "for instance survey.dunlin.exclude.band"});
    std::ostringstream text;
    text << job << '\n';
    return text.str();
}

}  // namespace deviascope
