// SPDX-License-Identifier: GPL-2.0-or-later
#pragma once

#include <cstring>
#include <filesystem>
#include <fstream>
#include <iterator>
#include <stdexcept>
#include <string>
#include <vector>

namespace deviascope::test {

/// All bytes of a file.
inline std::string bytes_of(const std::filesystem::path& path) {
    std::ifstream file(path, std::ios::binary);
    if (!file) throw std::runtime_error("cannot read " + path.string());
    return std::string(std::istreambuf_iterator<char>(file), {});
}

/// Whether two lists hold the same bits: tells -0 from 0, and one not-a-number from another.
template <class Value>
bool same_bits(const std::vector<Value>& first, const std::vector<Value>& second) {
    return first.size() == second.size() &&
           (first.empty() ||
            std::memcmp(first.data(), second.data(), first.size() * sizeof(Value)) == 0);
}

}  // namespace deviascope::test
