// SPDX-License-Identifier: GPL-2.0-or-later
// MOCK: beside the flow; skies with known truth
#pragma once

#include "deviascope/mock/scenario.h"
#include "deviascope/sky/direction.h"
#include "deviascope/sky/healpix_map.h"
#include "deviascope/sky/pixelisation.h"

namespace deviascope {

/// The map a survey is thinned by, its frame filled in; every value 0 … 1, or NaN where absent.
/// Errors: InputError for a file (path, pixel, value or frame, what is allowed).
HealpixMap exposure_map(const MockExposure& exposure);

/// Reads an exposure map at directions of one frame.
class ExposureLookup {
  public:
    /// @param map  its frame must be known
    ExposureLookup(HealpixMap map, Frame frame_of_directions);
    /// Value of the pixel that holds a direction; 0 where absent.
    double at(const Direction& direction) const;

  private:
    HealpixMap map_;
    Pixelisation grid_;
    Eigen::Matrix3d to_map_;
};

}  // namespace deviascope
