// SPDX-License-Identifier: GPL-2.0-or-later
#include "job/name_rule.h"

#include <fmt/format.h>

#include <algorithm>
#include <utility>

namespace deviascope {

namespace {

bool is_plain(const std::string& name) {
    return std::all_of(name.begin(), name.end(), [](char c) {
        return (c >= 'a' && c <= 'z') || (c >= '0' && c <= '9') || c == '-';
    });
}

}  // namespace

NameRule::NameRule(std::vector<std::string> reserved) : reserved_(std::move(reserved)) {}

std::string NameRule::read(const TomlTable& table) {
    const auto name = table.text("name", required);
    if (!name) return {};
    if (!is_plain(*name)) {
        table.wrong("name", "a name of the characters a-z, 0-9 and -");
        return {};
    }
    if (std::find(reserved_.begin(), reserved_.end(), *name) != reserved_.end()) {
        table.wrong("name", fmt::format("any name but {}", listed(reserved_)));
        return {};
    }
    const auto [known, is_new] = line_of_.try_emplace(*name, table.line_of("name"));
    if (!is_new) {
        table.wrong("name",
                    "each name once",
                    fmt::format("it is taken in line {}; choose another", known->second));
        return {};
    }
    return *name;
}

}  // namespace deviascope
