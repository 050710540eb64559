// SPDX-License-Identifier: GPL-2.0-or-later
#include "deviascope/mock/exposure.h"

#include <fmt/format.h>

#include <cmath>
#include <utility>

#include "deviascope/core/error.h"

namespace deviascope {

namespace {

/// COORDSYS and `map_frame`: one of them, or both alike.
Frame frame_of(const HealpixMap& map, const ExposureFile& file) {
    const std::string place = file.path.string();
    const std::string allowed = "one of COORDSYS and map_frame names the frame of the map";
    if (!map.frame && !file.map_frame)
        throw InputError({place, "the map has no COORDSYS", allowed, "add map_frame"});
    if (map.frame && file.map_frame && *map.frame != *file.map_frame)
        throw InputError({place,
                          fmt::format("COORDSYS says {}, map_frame {}",
                                      name_of(*map.frame),
                                      name_of(*file.map_frame)),
                          allowed,
                          "leave map_frame out if COORDSYS is right"});
    return map.frame ? *map.frame : *file.map_frame;
}

void check_values(const HealpixMap& map, const ExposureFile& file) {
    for (std::size_t pixel = 0; pixel < map.value.size(); ++pixel) {
        const double value = map.value[pixel];
        if (std::isnan(value) || (value >= 0.0 && value <= 1.0)) continue;
        throw InputError({fmt::format("{}: pixel {} (RING)", file.path.string(), pixel),
                          fmt::format("exposure {}", value),
                          "a fraction 0 to 1 is needed, or a missing value",
                          "scale the map so that full exposure is 1"});
    }
}

HealpixMap map_of(const ExposureFile& file) {
    HealpixMap map = read_healpix_map(file.path);
    map.frame = frame_of(map, file);
    check_values(map, file);
    return map;
}

HealpixMap map_of(const ExposureGradient& gradient) {
    const Pixelisation grid(gradient.nside);
    const Direction towards = direction_of(gradient.lon_deg, gradient.lat_deg);
    HealpixMap map;
    map.nside = gradient.nside;
    map.frame = gradient.frame;
    for (const Direction& centre : grid.centres())
        map.value.push_back(1.0 - (1.0 - gradient.lowest) * 0.5 * (1.0 + centre.dot(towards)));
    return map;
}

}  // namespace

HealpixMap exposure_map(const MockExposure& exposure) {
    return std::visit([](const auto& source) { return map_of(source); }, exposure);
}

ExposureLookup::ExposureLookup(HealpixMap map, Frame frame_of_directions)
    : map_(std::move(map)), grid_(map_.nside) {
    ensure(map_.frame.has_value(), "an exposure map has a frame");
    to_map_ = rotation(frame_of_directions, *map_.frame);
}

double ExposureLookup::at(const Direction& direction) const {
    const double value =
        map_.value[static_cast<std::size_t>(grid_.pixel_at(to_map_ * direction))];
    return std::isnan(value) ? 0.0 : value;
}

}  // namespace deviascope
