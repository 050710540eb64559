// SPDX-License-Identifier: GPL-2.0-or-later
// SKY: where things are, no sources
#pragma once

#include <Eigen/Core>
#include <optional>
#include <string>
#include <string_view>
#include <vector>

namespace deviascope {

/// Celestial frames. Ecliptic: mean ecliptic and equinox of J2000.0 (TT 2451545.0), IAU 2006
/// precession with frame bias, ERFA eraEcm06.
enum class Frame { galactic, icrs, ecliptic };

/// `galactic`, `icrs`, `ecliptic`: the spelling of the job file.
std::string name_of(Frame frame);
std::optional<Frame> frame_of_name(std::string_view name);
const std::vector<std::string>& frame_names();

/// Rotation matrix R with v_to = R v_from. Exact identity where from == to; otherwise products
/// of ERFA's matrices (eraIcrs2g's ICRS-to-galactic matrix, eraEcm06). Accuracy: 1e-15 a
/// component against ERFA's own routines.
Eigen::Matrix3d rotation(Frame from, Frame to);

}  // namespace deviascope
