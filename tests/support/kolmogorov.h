// SPDX-License-Identifier: GPL-2.0-or-later
#pragma once

#include <algorithm>
#include <cmath>
#include <functional>
#include <vector>

/// Largest distance between the empirical distribution of draws and a cumulative distribution,
/// times sqrt(n): above 1.949 with probability 0.001 (Kolmogorov 1933; textbook value).
inline double kolmogorov_distance(std::vector<double> draws,
                                  const std::function<double(double)>& cumulative) {
    std::sort(draws.begin(), draws.end());
    const double n = static_cast<double>(draws.size());
    double largest = 0.0;
    for (std::size_t i = 0; i < draws.size(); ++i) {
        const double below = static_cast<double>(i) / n;
        const double at = cumulative(draws[i]);
        largest = std::max({largest, at - below, below + 1.0 / n - at});
    }
    return largest * std::sqrt(n);
}
