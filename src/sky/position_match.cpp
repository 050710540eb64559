// SPDX-License-Identifier: GPL-2.0-or-later
#include "deviascope/sky/position_match.h"

#include <algorithm>
#include <cmath>
#include <numbers>

#include "deviascope/core/error.h"

namespace deviascope {

namespace {

constexpr double pi = std::numbers::pi;
constexpr double least_zone_height = 2e-5;  // some 4 arcsec: at most 160,000 zones
constexpr double rounding = 1e-14;          // of latitudes and longitudes, radians

}  // namespace

PositionIndex::PositionIndex(const std::vector<Direction>& positions, double radius)
    : radius_(radius),
      square_chord_(4.0 * std::pow(std::sin(0.5 * radius), 2)),
      zone_height_(std::max(radius, least_zone_height)) {
    ensure(radius > 0.0 && radius <= 0.1, "a matching radius is above 0 and small");
    entries_.reserve(positions.size());
    for (const Direction& at : positions)
        entries_.push_back({zone_of(latitude_of(at)), std::atan2(at.y(), at.x()), at});
    std::sort(entries_.begin(), entries_.end(), [](const Entry& a, const Entry& b) {
        return a.zone != b.zone ? a.zone < b.zone : a.lon < b.lon;
    });
    const auto n_zones = static_cast<std::size_t>(zone_of(0.5 * pi)) + 1;
    first_.assign(n_zones + 1, 0);
    for (const Entry& entry : entries_) ++first_[static_cast<std::size_t>(entry.zone) + 1];
    for (std::size_t zone = 0; zone < n_zones; ++zone) first_[zone + 1] += first_[zone];
}

double PositionIndex::latitude_of(const Direction& direction) const {
    return std::atan2(direction.z(), std::hypot(direction.x(), direction.y()));
}

std::int64_t PositionIndex::zone_of(double latitude) const {
    return static_cast<std::int64_t>(std::max(latitude + 0.5 * pi, 0.0) / zone_height_);
}

/// Whether a zone holds a neighbour with a longitude in from … to, both within -pi … pi.
bool PositionIndex::near(std::int64_t zone,
                         double from,
                         double to,
                         const Direction& direction) const {
    const auto z = static_cast<std::size_t>(zone);
    const auto begin = entries_.begin() + static_cast<std::ptrdiff_t>(first_[z]);
    const auto end = entries_.begin() + static_cast<std::ptrdiff_t>(first_[z + 1]);
    auto at = std::lower_bound(
        begin, end, from, [](const Entry& entry, double lon) { return entry.lon < lon; });
    for (; at != end && at->lon <= to; ++at)
        if ((at->direction - direction).squaredNorm() <= square_chord_) return true;
    return false;
}

bool PositionIndex::has_neighbour(const Direction& direction) const {
    const double latitude = latitude_of(direction);
    const double lon = std::atan2(direction.y(), direction.x());
    const double reach = radius_ + rounding;
    // Longitudes of a disc: all where it holds a pole, else asin(sin r / cos lat) either way.
    const bool at_pole = std::abs(latitude) + reach >= 0.5 * pi;
    const double half =
        at_pole ? pi
                : std::asin(std::min(std::sin(reach) / std::cos(latitude), 1.0)) + rounding;
    const std::int64_t last_zone = std::ssize(first_) - 2;
    const std::int64_t low = zone_of(latitude - reach);
    const std::int64_t high = std::min(zone_of(latitude + reach), last_zone);
    for (std::int64_t zone = low; zone <= high; ++zone) {
        if (near(zone, std::max(lon - half, -pi), std::min(lon + half, pi), direction))
            return true;
        if (lon - half < -pi && near(zone, lon - half + 2.0 * pi, pi, direction)) return true;
        if (lon + half > pi && near(zone, -pi, lon + half - 2.0 * pi, direction)) return true;
    }
    return false;
}

std::int64_t PositionIndex::matches_of(const PositionIndex& other) const {
    return std::count_if(other.entries_.begin(), other.entries_.end(), [&](const Entry& entry) {
        return has_neighbour(entry.direction);
    });
}

}  // namespace deviascope
