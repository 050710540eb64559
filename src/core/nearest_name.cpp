// SPDX-License-Identifier: GPL-2.0-or-later
#include "deviascope/core/nearest_name.h"

#include <algorithm>
#include <limits>

namespace deviascope {

namespace {

char lower(char c) {
    return c >= 'A' && c <= 'Z' ? static_cast<char>(c - 'A' + 'a') : c;
}

/// Optimal string alignment distance, ASCII case ignored. Three rows of the usual table.
std::size_t distance(std::string_view a, std::string_view b) {
    std::vector<std::size_t> before(b.size() + 1);
    std::vector<std::size_t> above(b.size() + 1);
    std::vector<std::size_t> row(b.size() + 1);
    for (std::size_t j = 0; j <= b.size(); ++j) above[j] = j;
    for (std::size_t i = 1; i <= a.size(); ++i) {
        row[0] = i;
        for (std::size_t j = 1; j <= b.size(); ++j) {
            const std::size_t change = lower(a[i - 1]) == lower(b[j - 1]) ? 0 : 1;
            row[j] = std::min({above[j] + 1, row[j - 1] + 1, above[j - 1] + change});
            const bool swapped = i > 1 && j > 1 && lower(a[i - 1]) == lower(b[j - 2]) &&
                                 lower(a[i - 2]) == lower(b[j - 1]);
            if (swapped) row[j] = std::min(row[j], before[j - 2] + 1);
        }
        std::swap(before, above);
        std::swap(above, row);
    }
    return above[b.size()];
}

}  // namespace

std::string nearest_name(std::string_view written, const std::vector<std::string>& known) {
    constexpr std::size_t longest = 200;
    if (written.size() > longest) return {};
    const std::size_t allowed = std::max<std::size_t>(1, written.size() / 3);
    std::size_t best = std::numeric_limits<std::size_t>::max();
    std::string nearest;
    for (const std::string& name : known) {
        const std::size_t d = distance(written, name);
        if (d < best && d <= allowed) {
            best = d;
            nearest = name;
        }
    }
    return nearest;
}

}  // namespace deviascope
