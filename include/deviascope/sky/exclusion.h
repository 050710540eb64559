// SPDX-License-Identifier: GPL-2.0-or-later
// SKY: where things are, no sources
#pragma once

#include <Eigen/Core>
#include <string>
#include <variant>

#include "deviascope/sky/direction.h"
#include "deviascope/sky/frame.h"

namespace deviascope {

/// |lat| below half_width_deg is excluded: kept where |sin lat| >= sin(half_width) - 1e-12.
struct BandExclusion {
    double half_width_deg = 0.0;
};
/// A disc: excluded where the chord to its centre is <= chord(radius) - 1e-12.
struct DiscExclusion {
    double lon_deg = 0.0, lat_deg = 0.0, radius_deg = 0.0;
};
/// South of a latitude is excluded: kept where sin lat >= sin(lat_deg) - 1e-12.
struct BelowExclusion {
    double lat_deg = 0.0;
};
/// North of a latitude is excluded: kept where sin lat <= sin(lat_deg) + 1e-12.
struct AboveExclusion {
    double lat_deg = 0.0;
};

/// A region of sky whose pixels (by their centres) are left out.
struct Exclusion {
    std::variant<BandExclusion, DiscExclusion, BelowExclusion, AboveExclusion> region;
    Frame frame = Frame::galactic;  ///< frame of the region's numbers

    /// In the job file's own words, for reports: `band 15 deg galactic`.
    std::string label() const;
};

/// An exclusion made ready to judge directions of one frame.
class ExclusionTest {
  public:
    /// Errors: InternalError unless a band is 0 … 90 deg, a disc 0 … 180 deg, a latitude -90 …
    /// 90 deg (callers check input).
    ExclusionTest(const Exclusion& exclusion, Frame frame_of_directions);
    /// True where a pixel with this centre is left out.
    bool excludes(const Direction& centre) const;

  private:
    Exclusion exclusion_;
    Eigen::Matrix3d to_region_;
    Direction disc_centre_ = Direction::UnitZ();
    double bound_ = 0.0;
};

}  // namespace deviascope
