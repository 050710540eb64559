// SPDX-License-Identifier: GPL-2.0-or-later
// COUNTS (private): which frame a map is in
#pragma once

#include <filesystem>
#include <optional>

#include "deviascope/sky/frame.h"

namespace deviascope {

/// The frame of a map that was read from `path`: what its COORDSYS says, else `map_frame` of
/// the job. Errors: InputError: neither is given, or both and unlike.
Frame frame_of_map(const std::filesystem::path& path,
                   std::optional<Frame> in_file,
                   std::optional<Frame> map_frame);

}  // namespace deviascope
