// SPDX-License-Identifier: GPL-2.0-or-later
// JOB: TOML to the options of the stages
#pragma once

#include <map>
#include <string>
#include <vector>

#include "deviascope/counts/survey_input.h"
#include "job/toml_reader.h"

namespace deviascope {

/// Property -> column name.
using Columns = std::map<std::string, std::string>;

/// The `columns` of a survey; lon and lat required, each column once.
Columns read_columns(const TomlTable& survey, Presence presence);

/// Whether a key of a table names a property of a survey other than its position; a fault of
/// that key where it does not.
bool names_property(const TomlTable& table, const std::string& key, const Columns& columns);

/// A `select` table: half-open ranges of properties, in the order of the file.
std::vector<PropertyRange> read_select(const TomlTable& table, const Columns& columns);

/// The `exclude` array of a survey.
std::vector<Exclusion> read_exclusions(const TomlTable& survey);

}  // namespace deviascope
