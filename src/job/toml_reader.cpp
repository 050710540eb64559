// SPDX-License-Identifier: GPL-2.0-or-later
#include "job/toml_reader.h"

#include <fmt/format.h>

#include <algorithm>
#include <limits>
#include <tuple>

#include "deviascope/core/nearest_name.h"

namespace deviascope {

namespace {

bool is_bare(std::string_view key) {
    return !key.empty() && std::all_of(key.begin(), key.end(), [](char c) {
        return (c >= 'a' && c <= 'z') || (c >= 'A' && c <= 'Z') || (c >= '0' && c <= '9') ||
               c == '-' || c == '_';
    });
}

std::string in_quotes(std::string_view text) {
    constexpr std::size_t longest = 80;
    if (text.size() <= longest) return fmt::format("\"{}\"", text);
    return fmt::format("\"{}…\"", text.substr(0, longest));
}

std::string shown(const toml::node& node);

std::string shown_array(const toml::array& array) {
    constexpr std::size_t most = 6;
    if (array.size() > most) return fmt::format("an array of {} values", array.size());
    std::string text;
    for (const toml::node& element : array) {
        text += (text.empty() ? "" : ", ") + shown(element);
    }
    return "[" + text + "]";
}

/// A value as a person wrote it, near enough to recognise it.
std::string shown(const toml::node& node) {
    if (const auto* text = node.as_string()) return in_quotes(text->get());
    if (const auto* integer = node.as_integer()) return fmt::format("{}", integer->get());
    if (const auto* number = node.as_floating_point())
        return fmt::format("{:#}", number->get());
    if (const auto* boolean = node.as_boolean()) return boolean->get() ? "true" : "false";
    if (const auto* array = node.as_array()) return shown_array(*array);
    return node.is_table() ? "a table" : "a date or time";
}

std::optional<double> number_in(const toml::node& node, const NumberRange& range) {
    std::optional<double> value;
    if (const auto* integer = node.as_integer()) value = static_cast<double>(integer->get());
    if (const auto* number = node.as_floating_point()) value = number->get();
    return value && range.holds(*value) ? value : std::nullopt;
}

std::optional<std::string> text_in(const toml::node& node) {
    const auto* text = node.as_string();
    return text && !text->get().empty() ? std::optional(text->get()) : std::nullopt;
}

std::optional<Eigen::VectorXd> numbers_in(const toml::node& node,
                                          Eigen::Index n,
                                          const NumberRange& range) {
    const auto* array = node.as_array();
    if (!array || static_cast<Eigen::Index>(array->size()) != n) return std::nullopt;
    Eigen::VectorXd values(n);
    for (Eigen::Index i = 0; i < n; ++i) {
        const auto value = number_in(*array->get(static_cast<std::size_t>(i)), range);
        if (!value) return std::nullopt;
        values(i) = *value;
    }
    return values;
}

std::optional<Eigen::MatrixXd> matrix_in(const toml::node& node, Eigen::Index n) {
    const auto* rows = node.as_array();
    if (!rows || static_cast<Eigen::Index>(rows->size()) != n) return std::nullopt;
    Eigen::MatrixXd values(n, n);
    for (Eigen::Index i = 0; i < n; ++i) {
        const auto row = numbers_in(*rows->get(static_cast<std::size_t>(i)), n, {});
        if (!row) return std::nullopt;
        values.row(i) = row->transpose();
    }
    return values;
}

std::optional<std::vector<std::string>> texts_in(const toml::node& node) {
    if (const auto one = text_in(node)) return std::vector<std::string>{*one};
    const auto* array = node.as_array();
    if (!array || array->empty()) return std::nullopt;
    std::vector<std::string> values;
    for (const toml::node& element : *array) {
        const auto value = text_in(element);
        if (!value) return std::nullopt;
        values.push_back(*value);
    }
    return values;
}

std::string integer_text(std::int64_t low, std::int64_t high) {
    if (high == std::numeric_limits<std::int64_t>::max()) {
        return fmt::format("an integer of at least {}", low);
    }
    return fmt::format("an integer from {} to {}", low, high);
}

/// A key path as a table heading spells it: without the counts of arrays.
std::string heading(std::string_view path) {
    std::string text;
    int depth = 0;
    for (const char c : path) {
        if (c == '[') ++depth;
        if (depth == 0) text += c;
        if (c == ']') --depth;
    }
    return text;
}

/// A fault of the TOML text itself, in our grammar.
Message syntax_fault(const toml::parse_error& error, const std::string& name) {
    const toml::source_position place = error.source().begin;
    std::string what(error.description());
    const std::string opening = "Error while parsing ";
    if (what.starts_with(opening)) what = "in " + what.substr(opening.size());
    const bool unquoted = what.find("could not determine value type") != std::string::npos;
    return {fmt::format("{}:{}:{}", name, place.line, place.column),
            "not TOML: " + what,
            "a text in TOML 1.0 is allowed",
            unquoted ? "write text in double quotes" : ""};
}

toml::table parsed(std::string_view text, const std::string& name) {
    try {
        return toml::parse(text, std::string_view(name));
    } catch (const toml::parse_error& error) {
        throw UsageError(syntax_fault(error, name));
    }
}

}  // namespace

std::string listed(const std::vector<std::string>& names, const char* last_joint) {
    std::string text;
    for (std::size_t i = 0; i < names.size(); ++i) {
        const char* joint = i == 0 ? "" : i + 1 == names.size() ? last_joint : ", ";
        text += joint + fmt::format("\"{}\"", names[i]);
    }
    return text;
}

std::string suggestion(std::string_view written, const std::vector<std::string>& known) {
    const std::string nearest = nearest_name(written, known);
    return nearest.empty() ? "" : fmt::format("did you mean \"{}\"?", nearest);
}

TomlDocument::TomlDocument(std::string_view text, std::string name)
    : name_(std::move(name)), table_(parsed(text, name_)) {}

TomlTable TomlDocument::root() {
    return {*this, &table_, "", {1, 1}};
}

void TomlDocument::add(const toml::source_position& place,
                       const std::string& path,
                       std::string found,
                       std::string allowed,
                       std::string remedy) {
    std::string where = fmt::format("{}:{}:{}", name_, place.line, place.column);
    if (!path.empty()) where += ": " + path;
    faults_.push_back(
        {place, {std::move(where), std::move(found), std::move(allowed), std::move(remedy)}});
}

void TomlDocument::report_unknown_keys() {
    for (const auto& [table, visit] : visits_) {
        if (visit.ignore_rest) continue;
        const auto& asked = visit.asked;
        for (const auto& [key, value] : *table) {
            const std::string name(key.str());
            if (std::find(asked.begin(), asked.end(), name) != asked.end()) continue;
            const std::string shown_key = is_bare(name) ? name : in_quotes(name);
            add(key.source().begin,
                visit.path.empty() ? shown_key : visit.path + "." + shown_key,
                "unknown key",
                "known here: " + listed(asked, ", "),
                suggestion(name, asked));
        }
    }
}

void TomlDocument::finish() {
    report_unknown_keys();
    if (faults_.empty()) return;
    std::stable_sort(faults_.begin(), faults_.end(), [](const Fault& a, const Fault& b) {
        return std::tie(a.place.line, a.place.column) < std::tie(b.place.line, b.place.column);
    });
    // Two readers may look at one key: each fault is told once.
    std::vector<Message> messages;
    for (const Fault& fault : faults_) {
        const std::string text = fault.message.text();
        const bool told = std::any_of(messages.begin(), messages.end(), [&](const Message& m) {
            return m.text() == text;
        });
        if (!told) messages.push_back(fault.message);
    }
    throw UsageError(std::move(messages));
}

TomlTable::TomlTable(TomlDocument& document,
                     const toml::table* table,
                     std::string path,
                     toml::source_position place)
    : document_(&document), table_(table), path_(std::move(path)), place_(place) {
    if (table_) document_->visits_[table_].path = path_;
}

const toml::node* TomlTable::find(const std::string& key) const {
    if (!table_) return nullptr;
    auto& asked = document_->visits_[table_].asked;
    if (std::find(asked.begin(), asked.end(), key) == asked.end()) asked.push_back(key);
    return table_->get(key);
}

std::string TomlTable::path_of(const std::string& key) const {
    const std::string last = is_bare(key) ? key : in_quotes(key);
    return path_.empty() ? last : path_ + "." + last;
}

toml::source_position TomlTable::place_of(const std::string& key) const {
    const toml::node* node = table_ ? table_->get(key) : nullptr;
    return node ? node->source().begin : place_;
}

std::uint32_t TomlTable::line_of(const std::string& key) const {
    return place_of(key).line;
}

void TomlTable::fault(const std::string& key,
                      std::string found,
                      std::string allowed,
                      std::string remedy) const {
    if (silent_) return;
    document_->add(
        place_of(key), path_of(key), std::move(found), std::move(allowed), std::move(remedy));
}

void TomlTable::fault_here(std::string found, std::string allowed, std::string remedy) const {
    if (silent_) return;
    document_->add(place_, path_, std::move(found), std::move(allowed), std::move(remedy));
}

void TomlTable::wrong(const std::string& key,
                      const std::string& allowed,
                      std::string remedy) const {
    const toml::node* node = find(key);
    fault(key,
          node ? "found " + shown(*node) : "missing",
          allowed + " is allowed",
          std::move(remedy));
}

void TomlTable::missing(const std::string& key,
                        const std::string& allowed,
                        Presence presence) const {
    if (presence == Presence::required) fault(key, "missing", allowed + " is required");
}

void TomlTable::adopt(const std::string& key, const std::vector<Message>& faults) const {
    for (const Message& message : faults) {
        document_->faults_.push_back({place_of(key), message});
    }
}

void TomlTable::refuse(const std::string& key, std::string why, std::string remedy) const {
    if (find(key)) fault(key, std::move(why), "", std::move(remedy));
}

void TomlTable::ignore_unknown_keys() const {
    if (table_) document_->visits_[table_].ignore_rest = true;
}

bool TomlTable::has(const std::string& key) const {
    return find(key) != nullptr;
}

bool TomlTable::has_text(const std::string& key) const {
    const toml::node* node = find(key);
    return node && node->is_string();
}

bool TomlTable::has_table(const std::string& key) const {
    const toml::node* node = find(key);
    return node && node->is_table();
}

std::vector<std::string> TomlTable::keys() const {
    if (!table_) return {};
    std::vector<std::pair<toml::source_position, std::string>> found;
    for (const auto& [key, value] : *table_) {
        found.emplace_back(key.source().begin, std::string(key.str()));
    }
    std::sort(found.begin(), found.end());
    std::vector<std::string> names;
    for (auto& [place, name] : found) names.push_back(std::move(name));
    return names;
}

template <class Value>
std::optional<Value> TomlTable::read(
    const std::string& key,
    const std::string& allowed,
    Presence presence,
    const std::function<std::optional<Value>(const toml::node&)>& convert) const {
    const toml::node* node = find(key);
    if (!node) {
        missing(key, allowed, presence);
        return std::nullopt;
    }
    std::optional<Value> value = convert(*node);
    if (!value) wrong(key, allowed);
    return value;
}

std::optional<std::string> TomlTable::text(const std::string& key, Presence presence) const {
    return read<std::string>(key, "a text that is not empty", presence, text_in);
}

std::vector<std::string> TomlTable::texts(const std::string& key, Presence presence) const {
    return read<std::vector<std::string>>(
               key, "a text or an array of texts", presence, texts_in)
        .value_or(std::vector<std::string>{});
}

std::optional<double> TomlTable::number(const std::string& key,
                                        const NumberRange& range,
                                        Presence presence) const {
    return read<double>(key, range.text(), presence, [&](const toml::node& node) {
        return number_in(node, range);
    });
}

std::optional<std::int64_t> TomlTable::integer(const std::string& key,
                                               std::int64_t low,
                                               std::int64_t high,
                                               Presence presence) const {
    using Result = std::optional<std::int64_t>;
    return read<std::int64_t>(
        key, integer_text(low, high), presence, [&](const toml::node& node) -> Result {
            const auto* value = node.as_integer();
            if (!value || value->get() < low || value->get() > high) return std::nullopt;
            return value->get();
        });
}

std::optional<bool> TomlTable::boolean(const std::string& key, Presence presence) const {
    using Result = std::optional<bool>;
    return read<bool>(key, "true or false", presence, [](const toml::node& node) -> Result {
        return node.is_boolean() ? Result(node.as_boolean()->get()) : std::nullopt;
    });
}

std::optional<std::size_t> TomlTable::choice(const std::string& key,
                                             const std::vector<std::string>& names,
                                             Presence presence) const {
    const toml::node* node = find(key);
    if (!node) {
        missing(key, listed(names), presence);
        return std::nullopt;
    }
    const std::string written = text_in(*node).value_or("");
    const auto found = std::find(names.begin(), names.end(), written);
    if (found != names.end()) return static_cast<std::size_t>(found - names.begin());
    wrong(key, listed(names), suggestion(written, names));
    return std::nullopt;
}

std::optional<Eigen::VectorXd> TomlTable::numbers(const std::string& key,
                                                  Eigen::Index n,
                                                  const NumberRange& range,
                                                  Presence presence) const {
    const std::string allowed = fmt::format(
        "an array of {} {}", n, range.infinite ? "numbers or inf" : "finite numbers");
    return read<Eigen::VectorXd>(key, allowed, presence, [&](const toml::node& node) {
        return numbers_in(node, n, range);
    });
}

std::optional<Eigen::MatrixXd> TomlTable::matrix(const std::string& key,
                                                 Eigen::Index n,
                                                 Presence presence) const {
    const std::string allowed = fmt::format("an array of {0} rows of {0} finite numbers", n);
    return read<Eigen::MatrixXd>(
        key, allowed, presence, [&](const toml::node& node) { return matrix_in(node, n); });
}

TomlTable TomlTable::table(const std::string& key) const {
    const toml::node* node = find(key);
    const toml::table* found = node ? node->as_table() : nullptr;
    if (node && !found) wrong(key, "a table");
    TomlTable result(*document_, found, path_of(key), place_of(key));
    result.silent_ = silent_ || (node && !found);
    return result;
}

std::vector<TomlTable> TomlTable::tables(const std::string& key, Presence presence) const {
    const std::string allowed =
        fmt::format("an array of tables, [[{}]],", heading(path_of(key)));
    const toml::node* node = find(key);
    if (!node) {
        missing(key, allowed, presence);
        return {};
    }
    const toml::array* array = node->as_array();
    const bool fits =
        array && std::all_of(array->begin(), array->end(), [](const auto& element) {
            return element.is_table();
        });
    if (!fits || (array->empty() && presence == Presence::required)) {
        wrong(key, allowed);
        return {};
    }
    std::vector<TomlTable> result;
    for (const toml::node& element : *array) {
        result.push_back({*document_,
                          element.as_table(),
                          fmt::format("{}[{}]", path_of(key), result.size() + 1),
                          element.source().begin});
    }
    return result;
}

}  // namespace deviascope
