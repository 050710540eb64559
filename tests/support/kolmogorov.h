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

/// Largest distance between two empirical distributions, times sqrt(n m / (n + m)): above 2.225
/// with probability 0.0001, 1.949 with 0.001 (Smirnov 1948; P = 2 exp(-2 x^2) for large x).
inline double smirnov_distance(std::vector<double> a, std::vector<double> b) {
    std::sort(a.begin(), a.end());
    std::sort(b.begin(), b.end());
    const double n = static_cast<double>(a.size()), m = static_cast<double>(b.size());
    double largest = 0.0;
    std::size_t i = 0, j = 0;
    while (i < a.size() && j < b.size()) {
        const double at = std::min(a[i], b[j]);
        while (i < a.size() && a[i] <= at) ++i;
        while (j < b.size() && b[j] <= at) ++j;
        largest = std::max(largest,
                           std::abs(static_cast<double>(i) / n - static_cast<double>(j) / m));
    }
    return largest * std::sqrt(n * m / (n + m));
}
