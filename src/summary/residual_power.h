// SPDX-License-Identifier: GPL-2.0-or-later
// SUMMARY, private
#pragma once

#include <array>
#include <vector>

#include "deviascope/summary/fit_check.h"

namespace deviascope {

/// chi2 of the multipoles 2, 3 and 4 of the residuals n - lambda (fit_check.h); probabilities
/// are the caller's to fill. NaN where the footprint cannot hold the multipole.
std::array<ResidualPower, 3> residual_power(const Footprint& footprint,
                                            const BinCounts& bin,
                                            const std::vector<double>& expected,
                                            const Pixelisation& grid);

}  // namespace deviascope
