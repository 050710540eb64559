// SPDX-License-Identifier: GPL-2.0-or-later
#include "summary/vector_words.h"

#include "deviascope/core/error.h"
#include "deviascope/core/physical_constants.h"
#include "summary/rounding.h"

namespace deviascope {

std::string name_of(const VectorSummary& vector) {
    if (vector.name == "velocity") return vector.name;
    return vector.name == "all" ? "intrinsic dipole" : "intrinsic dipole of " + vector.name;
}

std::string limit_in_words(const VectorSummary& vector) {
    ensure(vector.amplitude_limits.has_value(), "the amplitude has an upper limit");
    if (vector.name == "velocity")
        return rounded(*vector.amplitude_limits, 1.0 / speed_of_light_km_s) + " km/s";
    return rounded(*vector.amplitude_limits, 1e-3) + " x 10^-3";
}

}  // namespace deviascope
