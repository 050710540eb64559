// SPDX-License-Identifier: GPL-2.0-or-later
#include "counts/map_frame.h"

#include <fmt/format.h>

#include "deviascope/core/error.h"

namespace deviascope {

Frame frame_of_map(const std::filesystem::path& path,
                   std::optional<Frame> in_file,
                   std::optional<Frame> map_frame) {
    if (!in_file && !map_frame) {
        throw InputError({path.string(),
                          "the map does not say in which frame it is (no COORDSYS)",
                          "COORDSYS G, E or C in the file, or `map_frame` of the survey",
                          "set map_frame = \"galactic\", \"icrs\" or \"ecliptic\""});
    }
    if (in_file && map_frame && *in_file != *map_frame) {
        throw InputError(
            {path.string(),
             fmt::format(
                 "COORDSYS says {}, map_frame says {}", name_of(*in_file), name_of(*map_frame)),
             "both name the same frame where both are given",
             "remove map_frame, or correct COORDSYS of the file"});
    }
    return in_file ? *in_file : *map_frame;
}

}  // namespace deviascope
