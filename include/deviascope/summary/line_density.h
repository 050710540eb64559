// SPDX-License-Identifier: GPL-2.0-or-later
// chain -> SUMMARY -> figures
#pragma once

#include <optional>
#include <span>
#include <vector>

namespace deviascope {

/// Ends of the range that a scalar can take, where it has any.
struct Support {
    std::optional<double> lowest{}, highest{};
};

/// The probability density of a scalar on an even grid.
struct LineDensity {
    std::vector<double> place, density;  ///< same length; density in 1/unit, integral 1

    /// By linear interpolation; 0 outside the grid.
    double at(double value) const;
    double peak() const;
};

/// Density of a scalar from its draws: Gaussian kernel, and at ends of the support the
/// non-negative boundary form, which neither leaks beyond an end nor bends there.
///
///   h  = 1.06 min(sd, IQR/1.349) n_eff^(-1/5)
///   f0 = f_plain / a_0,  f_lin = (a_2 f_plain - a_1 f_first) / (a_0 a_2 - a_1^2),
///   f  = f0 exp(f_lin / f0 - 1),  a_k the kernel's moments inside the support,
///   f_first the sum with (x - X)/h times the kernel
///
/// on 512 nodes that reach 4 h beyond the draws, or to the end of the support.
/// Domain: two values that differ, at least; a grid of no nodes otherwise.
/// Source: bandwidth: Silverman 1986, Density Estimation, Eq. 3.28 with the spread of 3.30;
/// boundary: Jones & Foster 1996, Statistica Sinica 6, 1005 (both from memory).
LineDensity line_density(std::span<const double> values,
                         double effective_draws,
                         const Support& support = {});

}  // namespace deviascope
