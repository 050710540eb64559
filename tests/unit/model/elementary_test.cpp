// SPDX-License-Identifier: GPL-2.0-or-later
#include "model/elementary.h"

#include <algorithm>
#include <array>
#include <catch2/catch.hpp>
#include <cmath>
#include <vector>

#include "deviascope/core/random.h"
#include "model/pixel_block.h"

using namespace deviascope;
using elementary::Reach;

namespace {

/// Error in units of the last place of a double near `exact`.
double error_in_ulp(double found, long double exact) {
    int exponent = 0;
    std::frexp(static_cast<double>(exact), &exponent);
    const long double unit = std::ldexp(1.0L, std::max(exponent, -1021) - 53);
    return static_cast<double>(std::abs(static_cast<long double>(found) - exact) / unit);
}

/// Random arguments crowded where the functions are hard: near 0, near the ends, everywhere.
double hard_argument(Stream& stream, int kind, double furthest) {
    const double sign = uniform(stream) < 0.5 ? -1.0 : 1.0;
    const double u = uniform(stream);
    switch (kind) {
        case 0:
            return sign * u * furthest;
        case 1:
            return sign * std::pow(10.0, -18.0 * u) * furthest;
        case 2:
            return sign * (1.0 - std::exp2(-53.0 * u)) * furthest;
        case 3:
            return sign * std::min(0.4 * u, furthest);
        default:
            return sign * std::min(0.2 + 0.6 * u, furthest);
    }
}

/// The series that the loops choose for these bounds.
double log1p_for(double size, double x) {
    if (size < elementary::small_bound) return elementary::log1p<Reach::small>(x);
    return size < elementary::log1p_near_bound ? elementary::log1p<Reach::near>(x)
                                               : elementary::log1p<Reach::far>(x);
}
double expm1_for(double furthest, double y) {
    if (furthest < elementary::tiny_bound) return elementary::expm1<Reach::tiny>(y);
    if (furthest < elementary::small_bound) return elementary::expm1<Reach::small>(y);
    return furthest < elementary::expm1_near_bound ? elementary::expm1<Reach::near>(y)
                                                   : elementary::expm1<Reach::far>(y);
}

}  // namespace

TEST_CASE("log1p is exact where it must be", "[model]") {
    CHECK(elementary::log1p<Reach::far>(0.0) == 0.0);
    CHECK(elementary::log1p<Reach::near>(0.0) == 0.0);
    CHECK(elementary::log1p<Reach::far>(1e-300) == 1e-300);
    CHECK(elementary::log1p<Reach::far>(1.0) == Approx(std::log(2.0)).epsilon(1e-15));
    CHECK(elementary::log1p<Reach::far>(elementary::log1p_lowest) ==
          Approx(-53.0 * std::log(2.0)).epsilon(1e-15));
    CHECK(elementary::log1p<Reach::far>(-1.0) ==
          elementary::log1p<Reach::far>(elementary::log1p_lowest));
}

TEST_CASE("log1p agrees with long double within two units in the last place", "[model]") {
    // Outside truth: log1pl of the C library, 80-bit.
    Stream stream(31, Purpose::test, 0, 0, 0);
    double far = 0.0, near = 0.0, small = 0.0;
    for (int draw = 0; draw < 300000; ++draw) {
        const double x = hard_argument(stream, draw % 5, 1.0 - 0x1p-53);
        const long double exact = std::log1p(static_cast<long double>(x));
        far = std::max(far, error_in_ulp(elementary::log1p<Reach::far>(x), exact));
        if (std::abs(x) <= elementary::log1p_near_bound)
            near = std::max(near, error_in_ulp(elementary::log1p<Reach::near>(x), exact));
        if (std::abs(x) <= elementary::small_bound)
            small = std::max(small, error_in_ulp(elementary::log1p<Reach::small>(x), exact));
    }
    CHECK(far < 2.0);
    CHECK(near < 2.0);
    CHECK(small < 2.0);
    for (const double x : {elementary::small_bound, -elementary::small_bound})
        CHECK(error_in_ulp(elementary::log1p<Reach::small>(x),
                           std::log1p(static_cast<long double>(x))) < 2.0);
}

TEST_CASE("expm1 is exact where it must be", "[model]") {
    CHECK(elementary::expm1<Reach::far>(0.0) == 0.0);
    CHECK(elementary::expm1<Reach::tiny>(0.0) == 0.0);
    CHECK(elementary::expm1<Reach::far>(-1e-300) == -1e-300);
    CHECK(elementary::expm1<Reach::far>(-1e4) == -1.0);
    CHECK(elementary::expm1<Reach::far>(1e4) ==
          elementary::expm1<Reach::far>(elementary::expm1_furthest));
    CHECK(std::isfinite(elementary::expm1<Reach::far>(1e4)));
}

TEST_CASE("expm1 agrees with long double within two units in the last place", "[model]") {
    // Outside truth: expm1l of the C library, 80-bit.
    Stream stream(32, Purpose::test, 0, 0, 0);
    double far = 0.0, near = 0.0, small = 0.0, tiny = 0.0;
    for (int draw = 0; draw < 300000; ++draw) {
        const double furthest =
            std::array{700.0, 2.0, 0.05}[static_cast<std::size_t>(draw % 3)];
        const double y = hard_argument(stream, draw % 5, furthest);
        const long double exact = std::expm1(static_cast<long double>(y));
        far = std::max(far, error_in_ulp(elementary::expm1<Reach::far>(y), exact));
        if (std::abs(y) <= elementary::expm1_near_bound)
            near = std::max(near, error_in_ulp(elementary::expm1<Reach::near>(y), exact));
        if (std::abs(y) <= elementary::small_bound)
            small = std::max(small, error_in_ulp(elementary::expm1<Reach::small>(y), exact));
        if (std::abs(y) <= elementary::tiny_bound)
            tiny = std::max(tiny, error_in_ulp(elementary::expm1<Reach::tiny>(y), exact));
    }
    CHECK(far < 2.0);
    CHECK(near < 2.0);
    CHECK(small < 2.0);
    CHECK(tiny < 2.0);
}

TEST_CASE("the widest loop of this processor gives the bits of a plain loop", "[model]") {
    Stream stream(33, Purpose::test, 0, 0, 0);
    std::vector<double> x(block_size), y(block_size), z(block_size), exposure(block_size);
    std::vector<std::int32_t> count(block_size);
    for (std::size_t p = 0; p < block_size; ++p) {
        z[p] = 2.0 * uniform(stream) - 1.0;
        const double lon = 6.283185307179586 * uniform(stream);
        x[p] = std::sqrt(1.0 - z[p] * z[p]) * std::cos(lon);
        y[p] = std::sqrt(1.0 - z[p] * z[p]) * std::sin(lon);
        exposure[p] = uniform(stream);
        count[p] = static_cast<std::int32_t>(1000.0 * uniform(stream));
    }
    const auto tree = [](std::vector<double> v) {
        for (std::size_t half = block_size / 2; half >= 1; half /= 2)
            for (std::size_t p = 0; p < half; ++p) v[p] += v[p + half];
        return v[0];
    };
    // Sizes on both sides of every choice of series.
    for (const double size : {0.002, 0.01, 0.05, 0.07, 0.28, 0.7, 0.999999}) {
        const double furthest = -4.75 * std::log1p(-size);
        const BinOfWalker bin{exposure.data(), count.data(), 3.75, furthest};
        const DipoleOfWalker dipole{{0.6 * size, 0.0, -0.8 * size}, {&bin, 1}};
        const WalkerOnSky walker{{0.0, size, 0.0}, {&dipole, 1}};
        std::vector<PixelSums> sums(1);
        sum_block({x.data(), y.data(), z.data()}, 0, walker, sums);
        std::vector<double> counted(block_size), exposed(block_size);
        for (std::size_t p = 0; p < block_size; ++p) {
            const double intrinsic = log1p_for(
                size,
                dipole.vector[0] * x[p] + dipole.vector[1] * y[p] + dipole.vector[2] * z[p]);
            const double kinematic =
                log1p_for(size,
                          walker.receding[0] * x[p] + walker.receding[1] * y[p] +
                              walker.receding[2] * z[p]);
            const double ratio = intrinsic - 3.75 * kinematic;
            counted[p] = count[p] * ratio;
            exposed[p] = exposure[p] * expm1_for(furthest, ratio);
        }
        INFO("size " << size);
        CHECK(sums[0].counted == tree(counted));
        CHECK(sums[0].exposed == tree(exposed));
    }
}
