// SPDX-License-Identifier: GPL-2.0-or-later
#pragma once

#include <cstring>
#include <filesystem>
#include <fstream>
#include <iterator>
#include <stdexcept>
#include <string>
#include <type_traits>
#include <vector>

namespace deviascope::test {

/// All bytes of a file.
inline std::string bytes_of(const std::filesystem::path& path) {
    std::ifstream file(path, std::ios::binary);
    if (!file) throw std::runtime_error("cannot read " + path.string());
    return std::string(std::istreambuf_iterator<char>(file), {});
}

/// Whether two lists hold the same bits: tells -0 from 0, and one not-a-number from another.
template <class List, class Other>
bool same_bits(const List& first, const Other& second) {
    static_assert(std::is_same_v<typename List::value_type, typename Other::value_type>);
    return first.size() == second.size() &&
           (first.empty() ||
            std::memcmp(first.data(), second.data(), first.size() * sizeof(first.front())) ==
                0);
}

}  // namespace deviascope::test
