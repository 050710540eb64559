// SPDX-License-Identifier: GPL-2.0-or-later
// JOB: TOML to the options of the stages
#pragma once

#include <optional>
#include <string>

#include "deviascope/sky/frame.h"
#include "job/toml_reader.h"

namespace deviascope {

/// A key that names a frame.
inline std::optional<Frame> read_frame(const TomlTable& table,
                                       const std::string& key,
                                       Presence presence = Presence::optional) {
    const auto index = table.choice(key, frame_names(), presence);
    return index ? frame_of_name(frame_names()[*index]) : std::nullopt;
}

}  // namespace deviascope
