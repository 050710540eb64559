// SPDX-License-Identifier: GPL-2.0-or-later
#include "catalogue/column_match.h"

#include <fmt/format.h>
#include <fmt/ranges.h>

#include <algorithm>
#include <string_view>

#include "deviascope/core/error.h"
#include "deviascope/core/nearest_name.h"

namespace deviascope {

namespace {

char lower(char c) {
    return c >= 'A' && c <= 'Z' ? static_cast<char>(c - 'A' + 'a') : c;
}

bool same_but_for_case(std::string_view a, std::string_view b) {
    return std::ranges::equal(a, b, [](char x, char y) { return lower(x) == lower(y); });
}

template <class Same>
std::vector<std::size_t> matches(const std::vector<std::string>& known, Same same) {
    std::vector<std::size_t> found;
    for (std::size_t i = 0; i < known.size(); ++i)
        if (same(known[i])) found.push_back(i);
    return found;
}

/// The names of a file, cut short where a message would become unreadable.
std::string listed(const std::vector<std::string>& known) {
    constexpr std::size_t most = 20;
    if (known.size() <= most) return fmt::format("{}", fmt::join(known, ", "));
    return fmt::format("{}, … ({} in all)",
                       fmt::join(known.begin(), known.begin() + most, ", "),
                       known.size());
}

InputError no_such_column(const std::filesystem::path& path,
                          const std::string& name,
                          const std::vector<std::string>& known) {
    const std::string nearest = nearest_name(name, known);
    return InputError(
        {path.string(),
         fmt::format("there is no column `{}`", name),
         fmt::format("the columns are {}", listed(known)),
         nearest.empty() ? "name one of these" : fmt::format("did you mean `{}`?", nearest)});
}

InputError ambiguous_column(const std::filesystem::path& path,
                            const std::string& name,
                            const std::vector<std::size_t>& found) {
    std::vector<std::string> numbers;
    for (const std::size_t i : found) numbers.push_back(fmt::format("{}", i + 1));
    return InputError(
        {path.string(),
         fmt::format(
             "`{}` could be any of the columns number {}", name, fmt::join(numbers, ", ")),
         "a name must belong to one column",
         "rename the columns in the file, or write the name exactly"});
}

}  // namespace

std::size_t match_column(const std::filesystem::path& path,
                         const std::string& name,
                         const std::vector<std::string>& known) {
    auto found = matches(known, [&](const std::string& other) { return other == name; });
    if (found.empty()) {
        found = matches(
            known, [&](const std::string& other) { return same_but_for_case(other, name); });
    }
    if (found.empty()) throw no_such_column(path, name, known);
    if (found.size() > 1) throw ambiguous_column(path, name, found);
    return found.front();
}

}  // namespace deviascope
