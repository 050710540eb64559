// SPDX-License-Identifier: GPL-2.0-or-later
#include "deviascope/sky/exclusion.h"

#include <fmt/format.h>

#include <cmath>

#include "deviascope/core/error.h"

namespace deviascope {

namespace {

/// How far from an edge still counts as on it: above the rounding of a rotated unit vector
/// (about 1e-15), below any distance between pixel centres. What lies on an edge is kept.
constexpr double tie = 1e-12;

double sine_of(double lat_deg) {
    return direction_of(0.0, lat_deg).z();
}

/// Chord between two unit vectors an angle apart: 2 sin(angle/2).
double chord_of(double angle_deg) {
    return 2.0 * sine_of(angle_deg / 2.0);
}

bool is_latitude(double lat_deg) {
    return lat_deg >= -90.0 && lat_deg <= 90.0;
}

/// One call per kind of region.
template <class... Calls>
struct PerKind : Calls... {
    using Calls::operator()...;
};
template <class... Calls>
PerKind(Calls...) -> PerKind<Calls...>;

void check(const Exclusion& exclusion) {
    const bool sound = std::visit(
        PerKind{[](const BandExclusion& band) {
                    return band.half_width_deg >= 0.0 && band.half_width_deg <= 90.0;
                },
                [](const DiscExclusion& disc) {
                    return disc.radius_deg >= 0.0 && disc.radius_deg <= 180.0 &&
                           is_latitude(disc.lat_deg) && std::isfinite(disc.lon_deg);
                },
                [](const BelowExclusion& below) { return is_latitude(below.lat_deg); },
                [](const AboveExclusion& above) { return is_latitude(above.lat_deg); }},
        exclusion.region);
    ensure(sound, "a band is 0 to 90 deg, a disc 0 to 180 deg, a latitude -90 to 90 deg");
}

double bound_of(const Exclusion& exclusion) {
    check(exclusion);
    return std::visit(
        PerKind{[](const BandExclusion& band) { return sine_of(band.half_width_deg) - tie; },
                [](const DiscExclusion& disc) { return chord_of(disc.radius_deg) - tie; },
                [](const BelowExclusion& below) { return sine_of(below.lat_deg) - tie; },
                [](const AboveExclusion& above) { return sine_of(above.lat_deg) + tie; }},
        exclusion.region);
}

}  // namespace

std::string Exclusion::label() const {
    const std::string words = std::visit(
        PerKind{
            [](const BandExclusion& band) {
                return fmt::format("band {}", band.half_width_deg);
            },
            [](const DiscExclusion& disc) {
                return fmt::format(
                    "lon {} lat {} radius {}", disc.lon_deg, disc.lat_deg, disc.radius_deg);
            },
            [](const BelowExclusion& below) { return fmt::format("below {}", below.lat_deg); },
            [](const AboveExclusion& above) { return fmt::format("above {}", above.lat_deg); }},
        region);
    return words + " deg " + name_of(frame);
}

ExclusionTest::ExclusionTest(const Exclusion& exclusion, Frame frame_of_directions)
    : exclusion_(exclusion),
      to_region_(rotation(frame_of_directions, exclusion.frame)),
      bound_(bound_of(exclusion)) {
    if (const auto* disc = std::get_if<DiscExclusion>(&exclusion.region))
        disc_centre_ = direction_of(disc->lon_deg, disc->lat_deg);
}

bool ExclusionTest::excludes(const Direction& centre) const {
    const Direction direction = to_region_ * centre;
    return std::visit(
        PerKind{
            [&](const BandExclusion&) { return std::abs(direction.z()) < bound_; },
            [&](const DiscExclusion&) { return (direction - disc_centre_).norm() <= bound_; },
            [&](const BelowExclusion&) { return direction.z() < bound_; },
            [&](const AboveExclusion&) { return direction.z() > bound_; }},
        exclusion_.region);
}

}  // namespace deviascope
