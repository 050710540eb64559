// SPDX-License-Identifier: GPL-2.0-or-later
#include "counts/row_places.h"

#include "sky/many_directions.h"

namespace deviascope {

namespace {

/// Comparisons that NaN fails.
bool is_position(double lon_deg, double lat_deg) {
    return lon_deg >= -180.0 && lon_deg <= 360.0 && lat_deg >= -90.0 && lat_deg <= 90.0;
}

}  // namespace

RowPlaces::RowPlaces(const Selection& selection)
    : selection_(selection), to_job_(rotation(selection.input.frame, selection.frame)) {}

void RowPlaces::locate(const TableChunk& chunk) {
    const std::vector<double>& lon = chunk.column[selection_.rows.lon];
    const std::vector<double>& lat = chunk.column[selection_.rows.lat];
    direction_.resize(lon.size());
    pixel_.resize(lon.size());
    is_bad_.resize(lon.size());
    is_hole_.resize(lon.size());
    directions_of(lon, lat, to_job_, direction_);
    for (std::size_t row = 0; row < lon.size(); ++row)
        is_bad_[row] = !is_position(lon[row], lat[row]);
    selection_.grid.pixels_at(direction_, pixel_);
    selection_.sky.find_holes(direction_, is_hole_);
}

}  // namespace deviascope
