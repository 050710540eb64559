// SPDX-License-Identifier: GPL-2.0-or-later
// CATALOGUE (private): from a column's name to its place in the file
#pragma once

#include <cstddef>
#include <filesystem>
#include <string>
#include <vector>

namespace deviascope {

/// Index of the column called `name`: an exact match, else the only one that matches when ASCII
/// case is ignored.
/// @param known  names of all columns of the file, in file order
/// Errors: InputError: no such column (with the nearest name), or more than one.
std::size_t match_column(const std::filesystem::path& path,
                         const std::string& name,
                         const std::vector<std::string>& known);

}  // namespace deviascope
