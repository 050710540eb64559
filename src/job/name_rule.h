// SPDX-License-Identifier: GPL-2.0-or-later
// JOB: TOML to the options of the stages
#pragma once

#include <cstdint>
#include <map>
#include <optional>
#include <string>
#include <vector>

#include "job/toml_reader.h"

namespace deviascope {

/// Reads the names of sister tables (surveys, bins of one survey, hypotheses): [a-z0-9-]+,
/// each once, none of the reserved ones.
class NameRule {
  public:
    explicit NameRule(std::vector<std::string> reserved = {});
    /// The `name` of the next sister; empty where it is faulty.
    std::string read(const TomlTable& table);

  private:
    std::vector<std::string> reserved_;
    std::map<std::string, std::uint32_t> line_of_;
};

}  // namespace deviascope
