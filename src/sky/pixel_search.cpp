// SPDX-License-Identifier: GPL-2.0-or-later
// Built without traps and errno for mathematics, so that the compiler may work on several
// lanes.
#include "sky/pixel_search.h"

#include <cmath>

namespace deviascope {

namespace {

// What the loop calls must become part of each of its clones.
#define DEVIASCOPE_LANE [[gnu::always_inline]] inline

/// Nearest whole number for |v| < 2^51: adding 1.5 x 2^52 leaves no room for a fraction.
DEVIASCOPE_LANE double nearest(double v) {
    return (v + 0x1.8p52) - 0x1.8p52;
}

/// A number cut into its whole part and its distance from the middle between two whole numbers.
struct Cut {
    double whole, edge;
};
DEVIASCOPE_LANE Cut cut(double v) {
    const double whole = nearest(v - 0.5);
    return {whole, std::fabs(v - 0.5 - whole)};
}

/// floor(v) of a v that is a multiple of `step` (a power of two up to 1/2), exactly.
DEVIASCOPE_LANE double exact_floor(double v, double step) {
    return nearest(v - 0.5 + 0.5 * step);
}

DEVIASCOPE_LANE double larger(double a, double b) {
    return a > b ? a : b;
}

/// (2/pi) atan(r), |r| <= tan(pi/8): interpolated at the 8 Chebyshev points in r^2, error below
/// 3e-13 (coefficients from 40-digit arithmetic).
DEVIASCOPE_LANE double quarter_turns_of_tangent(double r) {
    const double u = r * r;
    return r *
           (0.636619772367100543 +
            u * (-0.212206590430071212 +
                 u * (0.127323910251079101 + u * (-0.0909435953603259341 +
                                                  u * (0.0706868020986736675 +
                                                       u * (-0.057248369841170816 +
                                                            u * (0.0443991214368613214 +
                                                                 u * -0.0239719850184067)))))));
}

/// Longitude in quarter turns, 0 … 4; NaN at the poles.
DEVIASCOPE_LANE double quarter_turns(double x, double y) {
    constexpr double tan_eighth = 0.41421356237309504880;  // tan(pi/8)
    const double ax = std::fabs(x);
    const double ay = std::fabs(y);
    const double low = ax > ay ? ay : ax;
    const double high = ax > ay ? ax : ay;
    const double rest =
        quarter_turns_of_tangent((low - tan_eighth * high) / (high + tan_eighth * low));
    const double near_x = 0.25 + rest;
    const double near_y = 0.75 - rest;
    const double first = ax > ay ? near_x : near_y;
    const double second = 2.0 - first;
    const double upper = x < 0.0 ? second : first;
    const double lower = 4.0 - upper;
    return y < 0.0 ? lower : upper;
}

struct Found {
    double pixel, edge;
};

/// The belt, |z| <= 2/3.
DEVIASCOPE_LANE Found search_belt(double nside, double turns, double z) {
    const double across = nside * (0.5 + turns);
    const double along = nside * z * 0.75;
    const Cut rising = cut(across - along);
    const Cut falling = cut(across + along);
    const double ring = nside + 1.0 + rising.whole - falling.whole;  // from z = 2/3, from 1
    const double shift = 1.0 - (ring - 2.0 * exact_floor(0.5 * ring, 0.5));  // 1 if even
    const double half =
        exact_floor(0.5 * (rising.whole + falling.whole - nside + shift + 1.0), 0.5);
    const double in_ring = 4.0 * nside;
    const double place = half - in_ring * exact_floor(half / in_ring, 1.0 / in_ring);
    return {2.0 * nside * (nside - 1.0) + (ring - 1.0) * in_ring + place,
            larger(rising.edge, falling.edge)};
}

/// The polar caps; `across` is the sine of the colatitude.
DEVIASCOPE_LANE Found search_cap(double nside, double turns, double z, double across) {
    const double za = std::fabs(z);
    const Cut quarter = cut(turns);
    const double inside = turns - quarter.whole;
    const double scale = nside * std::sqrt(3.0 * (across / (1.0 + za)) * across);
    const Cut rising = cut(inside * scale);
    const Cut falling = cut((1.0 - inside) * scale);
    const double ring = rising.whole + falling.whole + 1.0;  // from the pole, from 1
    const Cut place = cut(turns * ring);
    const double north = 2.0 * ring * (ring - 1.0) + place.whole;
    const double south = 12.0 * nside * nside - 2.0 * ring * (ring + 1.0) + place.whole;
    return {z > 0.0 ? north : south,
            larger(larger(rising.edge, falling.edge), larger(place.edge, quarter.edge))};
}

DEVIASCOPE_LANE Found search_one(double nside, double x, double y, double z) {
    const double across2 = x * x + y * y;
    const double excess = across2 + z * z - 1.0;
    const double scale = 1.0 - excess * (0.5 - 0.375 * excess);  // 1/length to 1e-18
    const double z_unit = z * scale;
    const double turns = quarter_turns(x, y);
    const Found belt = search_belt(nside, turns, z_unit);
    const Found cap = search_cap(nside, turns, z_unit, std::sqrt(across2) * scale);
    const double seam = std::fabs(z_unit) - 2.0 / 3.0;
    const double edge = seam <= 0.0 ? belt.edge : cap.edge;
    const double off_seam = std::fabs(seam) > 1e-9 ? edge : 1.0;
    return {seam <= 0.0 ? belt.pixel : cap.pixel, std::fabs(excess) < 1e-6 ? off_seam : 1.0};
}

#undef DEVIASCOPE_LANE

}  // namespace

#if defined(__x86_64__) && defined(__gnu_linux__) && !defined(DEVIASCOPE_ONE_INSTRUCTION_SET)
__attribute__((target_clones("avx2", "default")))
#endif
void search(SearchBlock& block, int nside) {
    const double* x = block.x.data();
    const double* y = block.y.data();
    const double* z = block.z.data();
    double* __restrict pixel = block.pixel.data();
    double* __restrict edge = block.edge.data();
    const std::size_t n = block.n;
    for (std::size_t lane = 0; lane < n; ++lane) {
        const Found found = search_one(double(nside), x[lane], y[lane], z[lane]);
        pixel[lane] = found.pixel;
        edge[lane] = found.edge;
    }
}

}  // namespace deviascope
