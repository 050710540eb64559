// SPDX-License-Identifier: GPL-2.0-or-later
// COUNTS (private): positions that are legal but suspicious
#pragma once

#include <bit>
#include <cstdint>
#include <limits>
#include <string>
#include <unordered_map>
#include <vector>

namespace deviascope {

/// Looks at the positions of a survey as they pass: could they be radians, or hours; do many
/// rows stand at exactly the same place? Memory is bounded: repeats are counted exactly up to
/// 65,536 different positions, above that in a sample of them (those whose keyless hash is
/// low). The answer does not depend on the order of the rows.
class PositionWatch {
  public:
    /// @param lon_deg, lat_deg  as catalogued, in range
    void add(double lon_deg, double lat_deg) {
        ++n_;
        least_lon_ = lon_deg < least_lon_ ? lon_deg : least_lon_;
        greatest_lon_ = lon_deg > greatest_lon_ ? lon_deg : greatest_lon_;
        least_lat_ = lat_deg < least_lat_ ? lat_deg : least_lat_;
        greatest_lat_ = lat_deg > greatest_lat_ ? lat_deg : greatest_lat_;
        const std::uint64_t hash = hash_of(lon_deg, lat_deg);
        if (hash <= highest_hash_) sample(hash);
    }
    /// Nothing below 100 rows, where anything may be chance.
    std::vector<std::string> suspicions() const;

  private:
    static std::uint64_t mixed(std::uint64_t x) {
        // The finaliser of splitmix64 (Steele, Lea & Flood 2014, OOPSLA).
        x = (x ^ (x >> 30U)) * 0xbf58476d1ce4e5b9U;
        x = (x ^ (x >> 27U)) * 0x94d049bb133111ebU;
        return x ^ (x >> 31U);
    }
    static std::uint64_t hash_of(double lon_deg, double lat_deg) {
        const auto lon = std::bit_cast<std::uint64_t>(lon_deg);
        const auto lat = std::bit_cast<std::uint64_t>(lat_deg);
        return mixed(mixed(lon + 0x9e3779b97f4a7c15U) ^ lat);
    }
    void sample(std::uint64_t hash);
    double repeated_share() const;

    std::int64_t n_ = 0;
    double least_lon_ = std::numeric_limits<double>::infinity();
    double greatest_lon_ = -std::numeric_limits<double>::infinity();
    double least_lat_ = std::numeric_limits<double>::infinity();
    double greatest_lat_ = -std::numeric_limits<double>::infinity();
    std::uint64_t highest_hash_ = std::numeric_limits<std::uint64_t>::max();
    std::unordered_map<std::uint64_t, std::int64_t> rows_at_;  // by hash, up to highest_hash_
};

}  // namespace deviascope
