// SPDX-License-Identifier: GPL-2.0-or-later
#include "deviascope/summary/direction_density.h"

#include <Eigen/Geometry>
#include <algorithm>
#include <catch2/catch.hpp>
#include <cmath>
#include <functional>
#include <numbers>
#include <vector>

#include "deviascope/core/physical_constants.h"
#include "deviascope/core/random.h"
#include "deviascope/sky/pixelisation.h"

using namespace deviascope;

namespace {

constexpr double pi = std::numbers::pi;
constexpr std::size_t n_draws = 20000;

Eigen::Matrix3d turn_to(const Direction& centre) {
    return Eigen::Quaterniond::FromTwoVectors(Direction::UnitZ(), centre).toRotationMatrix();
}

/// One draw of the von Mises-Fisher density: its 1 - cos(distance) has the distribution
/// function (1 - exp(-kappa s)) / (1 - exp(-2 kappa)) (Fisher 1953, Proc. R. Soc. A 217, 295).
Direction fisher_draw(double kappa, Stream& stream) {
    const double first = uniform(stream);
    const double azimuth = 2.0 * pi * uniform(stream);
    const double s = -std::log1p(first * std::expm1(-2.0 * kappa)) / kappa;
    const double sine = std::sqrt(s * (2.0 - s));
    return {sine * std::cos(azimuth), sine * std::sin(azimuth), 1.0 - s};
}

std::vector<Direction> fisher_draws(const Direction& centre,
                                    double kappa,
                                    std::uint64_t number,
                                    std::size_t n = n_draws) {
    const Eigen::Matrix3d turn = turn_to(centre);
    std::vector<Direction> draws(n);
    for (std::size_t draw = 0; draw < n; ++draw) {
        Stream stream(20260817, Purpose::test, number, draw, 0);
        draws[draw] = (turn * fisher_draw(kappa, stream)).normalized();
    }
    return draws;
}

/// Area, in square degrees, of the cap that holds P of a von Mises-Fisher density:
/// cos t = 1 + ln(1 - P (1 - exp(-2 kappa))) / kappa (Fisher 1953).
double cap_area(double kappa, double probability) {
    const double s = -std::log1p(probability * std::expm1(-2.0 * kappa)) / kappa;
    return 0.5 * s * full_sky_deg2;
}

/// Share of fresh draws inside the region: its true content.
double content(const DirectionDensity& density,
               const std::vector<Direction>& fresh,
               double probability) {
    const double level = density.level(probability);
    const auto inside = std::count_if(fresh.begin(), fresh.end(), [&](const Direction& draw) {
        return density.at(draw) >= level;
    });
    return static_cast<double>(inside) / static_cast<double>(fresh.size());
}

}  // namespace

TEST_CASE("caps that hold 68 and 95 % of a von Mises-Fisher density", "[summary]") {
    // The closed form itself against printed values (computed from Fisher 1953 with mpmath).
    CHECK(cap_area(10.0, 0.682689492137) == Approx(2367.661030909).margin(6e-10));
    CHECK(cap_area(100.0, 0.954499736104) == Approx(637.365914687).margin(6e-10));
    CHECK(cap_area(1000.0, 0.682689492137) == Approx(23.676610401).margin(6e-10));
    const double kappa = GENERATE(1.5, 10.0, 20.0, 100.0, 1000.0, 1e8, 1e14);
    const auto number = static_cast<std::uint64_t>(std::lround(std::log(kappa) * 10.0));
    const Direction centre = direction_of(264.021, 48.253);
    const DirectionDensity density(fisher_draws(centre, kappa, 100 + number), n_draws);
    const auto fresh = fisher_draws(centre, kappa, 300 + number, 40000);
    CAPTURE(kappa);
    for (const double probability : {level68, level95}) {
        CAPTURE(probability);
        CHECK(density.area_deg2(probability) ==
              Approx(cap_area(kappa, probability)).epsilon(0.03));
        CHECK(content(density, fresh, probability) == Approx(probability).margin(0.01));
    }
}

TEST_CASE("an elongated compact posterior keeps its area", "[summary]") {
    // Gaussian in the tangent plane, standard deviations 3 and 0.3 deg: the region that holds P
    // has the area -2 pi ln(1 - P) sd1 sd2 (chi-squared with 2 degrees of freedom).
    const Direction centre = direction_of(10.0, -89.5);
    const Eigen::Matrix3d turn = turn_to(centre);
    const auto draw_at = [&](std::uint64_t number, std::size_t draw) {
        Stream stream(20260817, Purpose::test, number, draw, 0);
        const double along = 3.0 * radians_per_degree * normal(stream);
        const double across = 0.3 * radians_per_degree * normal(stream);
        return Direction((turn * Eigen::Vector3d(along, across, 1.0)).normalized());
    };
    std::vector<Direction> draws(n_draws), fresh(40000);
    for (std::size_t draw = 0; draw < draws.size(); ++draw) draws[draw] = draw_at(500, draw);
    for (std::size_t draw = 0; draw < fresh.size(); ++draw) fresh[draw] = draw_at(501, draw);
    const DirectionDensity density(draws, n_draws);
    for (const double probability : {level68, level95}) {
        const double area = -2.0 * pi * std::log1p(-probability) * 3.0 * 0.3;
        CHECK(density.area_deg2(probability) == Approx(area).epsilon(0.03));
        CHECK(content(density, fresh, probability) == Approx(probability).margin(0.01));
    }
}

TEST_CASE("the density integrates to one and peaks where it should", "[summary]") {
    const double kappa = GENERATE(2.0, 50.0);
    const Direction centre = direction_of(120.0, 50.0);
    const DirectionDensity density(fisher_draws(centre, kappa, 520), n_draws);
    // Equal weights on HEALPix centres integrate a peak at its pole only to 3e-3 at this nside,
    // one away from the pole to 1e-4 (compared with nside 16, 64 and 128).
    const Pixelisation grid(32);
    double sum = 0.0, highest = 0.0;
    Direction peak = centre;
    for (const Direction& place : grid.centres()) {
        const double value = density.at(place);
        sum += value * grid.solid_angle();
        if (value > highest) highest = value, peak = place;
    }
    CHECK(sum == Approx(1.0).epsilon(5e-4));
    CHECK(separation(peak, centre) < 0.5 / std::sqrt(kappa));
    // Smoothing lowers a peak by h^2 / (sigma^2 + h^2): 5 % at this number of draws.
    const double true_peak = kappa / (2.0 * pi * -std::expm1(-2.0 * kappa));
    CHECK(density.at(centre) == Approx(true_peak).epsilon(0.1));
}

TEST_CASE("a posterior without a direction covers its share of the sky", "[summary]") {
    std::vector<Direction> draws(n_draws);
    for (std::size_t draw = 0; draw < n_draws; ++draw) {
        Stream stream(20260817, Purpose::test, 530, draw, 0);
        const double z = 2.0 * uniform(stream) - 1.0;
        const double azimuth = 2.0 * pi * uniform(stream);
        const double sine = std::sqrt(1.0 - z * z);
        draws[draw] = {sine * std::cos(azimuth), sine * std::sin(azimuth), z};
    }
    const MeanDirection mean = mean_direction(draws);
    CHECK(mean.length < least_mean_length);
    CHECK(std::isnan(mean.direction.x()));
    const DirectionDensity density(draws, n_draws);
    CHECK(density.area_deg2(level68) == Approx(level68 * full_sky_deg2).epsilon(0.03));
    CHECK(density.area_deg2(level95) == Approx(level95 * full_sky_deg2).epsilon(0.03));
}

TEST_CASE("two lobes on opposite sides keep their own widths", "[summary]") {
    const double kappa = GENERATE(30.0, 100.0, 300.0);
    const Direction centre = direction_of(40.0, -20.0);
    std::vector<Direction> draws = fisher_draws(centre, kappa, 540, n_draws / 2);
    for (const Direction& draw : fisher_draws(-centre, kappa, 541, n_draws / 2))
        draws.push_back(draw);
    const DirectionDensity density(draws, n_draws);
    CAPTURE(kappa);
    // Both lobes alike: P of the whole is P of each.
    CHECK(density.area_deg2(level68) == Approx(2.0 * cap_area(kappa, level68)).epsilon(0.05));
    CHECK(density.area_deg2(level95) == Approx(2.0 * cap_area(kappa, level95)).epsilon(0.05));
}

TEST_CASE("a weaker, wider second lobe is not drowned", "[summary]") {
    // 80 % within kappa = 200, 20 % within kappa = 30, 110 deg apart. Expected areas: level
    // sets of the sum of the two densities, each its cap area, found by bisection here.
    const double kappa[2] = {200.0, 30.0}, share[2] = {0.8, 0.2};
    const Direction centre[2] = {direction_of(0.0, 0.0), direction_of(110.0, 0.0)};
    std::vector<Direction> draws = fisher_draws(centre[0], kappa[0], 550, 16000);
    for (const Direction& draw : fisher_draws(centre[1], kappa[1], 551, 4000))
        draws.push_back(draw);
    const auto cut = [&](int lobe, double level) {  // 1 - cos of the level circle
        return std::max(0.0,
                        std::log(share[lobe] * kappa[lobe] / (2.0 * pi * level)) / kappa[lobe]);
    };
    const auto mass = [&](double level) {
        double sum = 0.0;
        for (int lobe = 0; lobe < 2; ++lobe)
            sum += share[lobe] * -std::expm1(-kappa[lobe] * cut(lobe, level));
        return sum;
    };
    const DirectionDensity density(draws, n_draws);
    for (const double probability : {level68, level95}) {
        double low = 1e-6, high = 100.0;
        for (int halving = 0; halving < 200; ++halving) {
            const double middle = std::sqrt(low * high);
            (mass(middle) > probability ? low : high) = middle;
        }
        const double area = 0.5 * (cut(0, low) + cut(1, low)) * full_sky_deg2;
        CHECK(density.area_deg2(probability) == Approx(area).epsilon(0.06));
    }
}

TEST_CASE("regions nest and ignore the order of the draws", "[summary]") {
    auto draws = fisher_draws(direction_of(0.0, 0.0), 5.0, 560, 3000);
    const DirectionDensity density(draws, 3000);
    CHECK(density.level(level95) < density.level(level68));
    CHECK(density.area_deg2(level95) > density.area_deg2(level68));
    std::reverse(draws.begin(), draws.end());
    const DirectionDensity reversed(draws, 3000);
    CHECK(reversed.area_deg2(level68) == Approx(density.area_deg2(level68)).epsilon(1e-6));
}

TEST_CASE("a few far draws do not swell a compact region", "[summary]") {
    auto draws = fisher_draws(direction_of(200.0, 10.0), 1e6, 570);
    const double alone = DirectionDensity(draws, n_draws).area_deg2(level68);
    for (int far = 0; far < 20; ++far) draws.push_back(direction_of(200.0, -80.0 + far));
    CHECK(DirectionDensity(draws, n_draws).area_deg2(level68) == Approx(alone).epsilon(0.05));
}

TEST_CASE("draws in one point or along an arc have next to no area", "[summary]") {
    const std::vector<Direction> same(100, direction_of(12.0, 34.0));
    CHECK(DirectionDensity(same, 100).area_deg2(level95) < 1e-20);
    std::vector<Direction> arc;
    for (int step = 0; step < 1000; ++step) arc.push_back(direction_of(0.001 * step, 0.0));
    const double area = DirectionDensity(arc, 1000).area_deg2(level95);
    CHECK(area > 0.0);
    CHECK(area < 1e-4);
}

TEST_CASE("mean directions and radii by hand", "[summary]") {
    const std::vector<Direction> draws{Direction::UnitX(), Direction::UnitY()};
    const MeanDirection mean = mean_direction(draws);
    CHECK(mean.length == Approx(std::sqrt(0.5)).epsilon(1e-15));
    CHECK(separation(mean.direction, Direction(1, 1, 0)) < 1e-15);
    CHECK(radius_about(draws, Direction::UnitX(), 0.5) == 0.0);
    CHECK(radius_about(draws, Direction::UnitX(), level95) == Approx(pi / 2).epsilon(1e-15));
    CHECK(mean_direction({}).length == 0.0);
}
