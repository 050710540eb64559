// SPDX-License-Identifier: GPL-2.0-or-later
// Matching of two lists of positions, one core: deviascope_bench_match [MILLIONS]
#include <fmt/format.h>

#include <chrono>
#include <cmath>
#include <cstdlib>
#include <vector>

#include "deviascope/core/random.h"
#include "deviascope/sky/position_match.h"

using namespace deviascope;

namespace {

std::vector<Direction> isotropic(std::size_t n, std::uint64_t which) {
    std::vector<Direction> positions(n);
    Stream stream(20261202, Purpose::test, which, 0, 0);
    for (Direction& at : positions) {
        const double z = 2.0 * uniform(stream) - 1.0;
        const double lon = 2.0 * M_PI * uniform(stream);
        const double across = std::sqrt(1.0 - z * z);
        at = {across * std::cos(lon), across * std::sin(lon), z};
    }
    return positions;
}

double seconds_since(std::chrono::steady_clock::time_point begin) {
    return std::chrono::duration<double>(std::chrono::steady_clock::now() - begin).count();
}

}  // namespace

int main(int argc, char** argv) {
    const std::size_t n = (argc > 1 ? std::strtoul(argv[1], nullptr, 10) : 10) * 1'000'000;
    const auto first = isotropic(n, 1), second = isotropic(n, 2);
    const double radius = 5.0 * radians_per_arcsec;
    const auto begin = std::chrono::steady_clock::now();
    const PositionIndex index(first, radius), other(second, radius);
    const double ordered = seconds_since(begin);
    const auto matches = index.matches_of(other);
    fmt::print(
        "{} against {} positions, 5 arcsec: {:.1f} s to order, {:.1f} s in all, {} "
        "matches ({:.0f} expected by chance)\n",
        n,
        n,
        ordered,
        seconds_since(begin),
        matches,
        static_cast<double>(n) * static_cast<double>(n) * radius * radius / 4.0);
}
