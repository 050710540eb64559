// SPDX-License-Identifier: GPL-2.0-or-later
#include "counts/position_watch.h"

#include <fmt/format.h>

#include <algorithm>
#include <cmath>
#include <numbers>

namespace deviascope {

namespace {

constexpr std::size_t largest_sample = 16384;
constexpr std::int64_t few_rows = 100;
constexpr double repeats_worth_a_word = 0.001;
constexpr double pi = std::numbers::pi;
constexpr double rounding = 1.0 + 1e-6;

}  // namespace

void PositionWatch::sample(std::uint64_t hash) {
    ++rows_at_[hash];
    while (rows_at_.size() > largest_sample) {
        highest_hash_ /= 2;
        std::erase_if(rows_at_, [&](const auto& place) { return place.first > highest_hash_; });
    }
}

/// Of all rows, those at a place where another row stands already.
double PositionWatch::repeated_share() const {
    std::int64_t rows = 0;
    for (const auto& place : rows_at_) rows += place.second;
    return rows == 0 ? 0.0
                     : 1.0 - static_cast<double>(rows_at_.size()) / static_cast<double>(rows);
}

std::vector<std::string> PositionWatch::suspicions() const {
    std::vector<std::string> found;
    if (n_ < few_rows) return found;
    const std::string extent = fmt::format(
        "longitudes run from {:.4g} to {:.4g}, latitudes "
        "from {:.4g} to {:.4g}",
        least_lon_,
        greatest_lon_,
        least_lat_,
        greatest_lat_);
    const double highest_lat = std::max(-least_lat_, greatest_lat_);
    const bool radians = least_lon_ >= -pi * rounding && greatest_lon_ <= 2.0 * pi * rounding &&
                         highest_lat <= 0.5 * pi * rounding;
    const bool hours = least_lon_ >= 0.0 && greatest_lon_ <= 24.0 && greatest_lon_ > 23.0 &&
                       greatest_lat_ - least_lat_ > 30.0;
    if (radians)
        found.push_back(extent + ": the positions look like radians, and are read as degrees");
    if (hours)
        found.push_back(extent + ": the longitudes look like hours, and are read as degrees");
    const double share = repeated_share();
    if (share >= repeats_worth_a_word)
        found.push_back(fmt::format(
            "about {:.2g} % of the rows ({}) stand at exactly the place of an earlier row: "
            "sources listed twice, or split into components, count more than once and scatter "
            "more than Poisson",
            100.0 * share,
            std::llround(share * static_cast<double>(n_))));
    return found;
}

}  // namespace deviascope
