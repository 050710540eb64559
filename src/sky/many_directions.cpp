// SPDX-License-Identifier: GPL-2.0-or-later
// Built without traps and errno for mathematics, so that the compiler may work on several
// lanes.
#include "sky/many_directions.h"

#include <algorithm>
#include <array>
#include <cmath>
#include <numbers>

#include "deviascope/core/error.h"

namespace deviascope {

namespace {

// What the loop calls must become part of each of its clones.
#define DEVIASCOPE_LANE [[gnu::always_inline]] inline

constexpr std::size_t capacity = 256;  // the block stays in the first-level cache
using Lane = std::array<double, capacity>;

struct Block {
    std::size_t n = 0;
    Lane lon{}, lat{};  // degrees
    Lane x{}, y{}, z{};
    double to[3][3]{};
};

/// Nearest whole number for |v| < 2^51: adding 1.5 x 2^52 leaves no room for a fraction.
DEVIASCOPE_LANE double nearest(double v) {
    return (v + 0x1.8p52) - 0x1.8p52;
}

struct SineCosine {
    double sine, cosine;
};

DEVIASCOPE_LANE SineCosine sine_cosine_of_eighth(double x) {
    const double u = x * x;
    double sine = 1.0 / 355687428096000.0;  // 1/17!
    sine = sine * u - 1.0 / 1307674368000.0;
    sine = sine * u + 1.0 / 6227020800.0;
    sine = sine * u - 1.0 / 39916800.0;
    sine = sine * u + 1.0 / 362880.0;
    sine = sine * u - 1.0 / 5040.0;
    sine = sine * u + 1.0 / 120.0;
    sine = sine * u - 1.0 / 6.0;
    double cosine = 1.0 / 20922789888000.0;  // 1/16!
    cosine = cosine * u - 1.0 / 87178291200.0;
    cosine = cosine * u + 1.0 / 479001600.0;
    cosine = cosine * u - 1.0 / 3628800.0;
    cosine = cosine * u + 1.0 / 40320.0;
    cosine = cosine * u - 1.0 / 720.0;
    cosine = cosine * u + 1.0 / 24.0;
    cosine = cosine * u - 0.5;
    return {x + x * (u * sine), 1.0 + u * cosine};
}

/// Sine and cosine of an angle in degrees: quarter turns swap them and change their signs.
DEVIASCOPE_LANE SineCosine sine_cosine(double angle_deg) {
    const double quarter = nearest(angle_deg / 90.0);
    const SineCosine rest =
        sine_cosine_of_eighth((angle_deg - 90.0 * quarter) * (std::numbers::pi / 180.0));
    const double turns = quarter - 4.0 * nearest(0.25 * quarter - 0.375);  // 0, 1, 2, 3
    const bool swapped = turns == 1.0 || turns == 3.0;
    const double sine = swapped ? rest.cosine : rest.sine;
    const double cosine = swapped ? rest.sine : rest.cosine;
    return {turns >= 2.0 ? -sine : sine, turns == 1.0 || turns == 2.0 ? -cosine : cosine};
}

#undef DEVIASCOPE_LANE

#if defined(__x86_64__) && defined(__gnu_linux__) && !defined(DEVIASCOPE_ONE_INSTRUCTION_SET)
__attribute__((target_clones("avx2", "default")))
#endif
void turn(Block& block) {
    for (std::size_t lane = 0; lane < block.n; ++lane) {
        const SineCosine lon = sine_cosine(block.lon[lane]);
        const SineCosine lat = sine_cosine(block.lat[lane]);
        const double x = lat.cosine * lon.cosine;
        const double y = lat.cosine * lon.sine;
        const double z = lat.sine;
        block.x[lane] = block.to[0][0] * x + block.to[0][1] * y + block.to[0][2] * z;
        block.y[lane] = block.to[1][0] * x + block.to[1][1] * y + block.to[1][2] * z;
        block.z[lane] = block.to[2][0] * x + block.to[2][1] * y + block.to[2][2] * z;
    }
}

}  // namespace

void directions_of(std::span<const double> lon_deg,
                   std::span<const double> lat_deg,
                   const Eigen::Matrix3d& to,
                   std::span<Direction> directions) {
    ensure(lon_deg.size() == lat_deg.size() && lon_deg.size() == directions.size(),
           "each position has a longitude, a latitude and a direction");
    Block block;
    for (int row = 0; row < 3; ++row)
        for (int column = 0; column < 3; ++column) block.to[row][column] = to(row, column);
    for (std::size_t first = 0; first < lon_deg.size(); first += capacity) {
        block.n = std::min(capacity, lon_deg.size() - first);
        for (std::size_t lane = 0; lane < block.n; ++lane) {
            const double lon = lon_deg[first + lane], lat = lat_deg[first + lane];
            const bool sound = std::abs(lon) <= 720.0 && std::abs(lat) <= 90.0;
            block.lon[lane] = sound ? lon : 0.0;
            block.lat[lane] = sound ? lat : 0.0;
        }
        turn(block);
        for (std::size_t lane = 0; lane < block.n; ++lane)
            directions[first + lane] = {block.x[lane], block.y[lane], block.z[lane]};
    }
}

}  // namespace deviascope
