// SPDX-License-Identifier: GPL-2.0-or-later
#include "deviascope/summary/velocity_offset.h"

#include <Eigen/Cholesky>
#include <catch2/catch.hpp>
#include <cmath>

#include "deviascope/core/physical_constants.h"
#include "deviascope/core/random.h"
#include "deviascope/sky/direction.h"

using namespace deviascope;

namespace {

constexpr std::uint64_t seed = 20261202;

/// Speed and direction of Planck Collaboration 2020, A&A 641, A1 (369.82 km/s, l 264.021, b
/// 48.253).
Eigen::Vector3d cmb_velocity() {
    return 369.82 / speed_of_light_km_s * direction_of(264.021, 48.253);
}

Eigen::Matrix3Xd gaussian_draws(const Eigen::Vector3d& mean,
                                const Eigen::Matrix3d& covariance,
                                Eigen::Index n) {
    const Eigen::Matrix3d factor = covariance.llt().matrixL();
    Eigen::Matrix3Xd draws(3, n);
    for (Eigen::Index draw = 0; draw < n; ++draw) {
        Stream stream(seed, Purpose::test, 1, static_cast<std::uint64_t>(draw), 0);
        Eigen::Vector3d z;
        for (double& one : z) one = normal(stream);
        draws.col(draw) = mean + factor * z;
    }
    return draws;
}

Eigen::Matrix3d tilted() {
    Eigen::Matrix3d covariance;
    covariance << 4, 1, 0, 1, 5, -1, 0, -1, 3;
    return 1e-8 * covariance;
}

}  // namespace

TEST_CASE("difference of two Gaussian velocities, worked", "[summary]") {
    // chi2 = D^T (C1 + C2)^-1 D, evaluated in quadruple precision.
    const GaussianDifference found =
        difference_of(Eigen::Vector3d(-6e-4, -15e-4, 14e-4) - cmb_velocity(),
                      tilted() + 3.7e-7 * 3.7e-7 * Eigen::Matrix3d::Identity());
    CHECK(found.chi2 == Approx(17.810005293494).epsilon(1e-10));
    CHECK(found.probability == Approx(4.813700386936e-04).epsilon(1e-9));
    CHECK(found.sigma == Approx(3.490914630799).epsilon(1e-10));
}

TEST_CASE("a difference with a flat direction has no level", "[summary]") {
    Eigen::Matrix3d flat = tilted();
    flat.row(1).setZero();
    flat.col(1).setZero();
    CHECK(std::isnan(difference_of(Eigen::Vector3d::Ones(), flat).chi2));
    const Eigen::Vector3d along(1.0, 2.0, -1.0);
    CHECK(std::isnan(difference_of(along, 1e-12 * along * along.transpose()).sigma));
}

TEST_CASE("offset of Gaussian draws from a reference", "[summary]") {
    const GaussianPrior reference{cmb_velocity(),
                                  3.7e-7 * 3.7e-7 * Eigen::Matrix3d::Identity()};
    const Eigen::Vector3d mean = cmb_velocity() + Eigen::Vector3d(2.5e-4, -2e-4, 2e-4);
    constexpr Eigen::Index n = 20000;
    const Eigen::Matrix3Xd draws = gaussian_draws(mean, tilted(), n);
    const VelocityOffset found = offset_from(draws, n, reference, seed, 2);
    const GaussianDifference exact =
        difference_of(mean - cmb_velocity(), tilted() + reference.covariance);
    // The sample's chi2 scatters by 2 sqrt(chi2 / n) and a little more from its covariance.
    CHECK(found.chi2 == Approx(exact.chi2).margin(0.15));
    CHECK(found.sigma == Approx(exact.sigma).margin(0.03));
    SECTION("the probability from the draws agrees where all is Gaussian") {
        // 5,000 draws: a standard error of sqrt(p (1 - p) / 5000), and the smoothing.
        const double error = std::sqrt(exact.probability * (1.0 - exact.probability) / 5000.0);
        CHECK_FALSE(found.shift_is_limit);
        CHECK(std::abs(found.shift_probability - exact.probability) < 4.0 * error + 0.003);
    }
    SECTION("angle and ratio are those of the draws") {
        // The reference is known to 3e-4 of its length: as good as a point.
        std::vector<double> angle, ratio;
        for (Eigen::Index draw = 0; draw < n; ++draw) {
            const Eigen::Vector3d v = draws.col(draw);
            angle.push_back(separation(v, cmb_velocity()) / radians_per_degree);
            ratio.push_back(v.norm() / cmb_velocity().norm());
        }
        CHECK(found.angle_deg.median ==
              Approx(estimate_of(angle).median).epsilon(0).margin(0.02));
        CHECK(found.speed_ratio.median ==
              Approx(estimate_of(ratio).median).epsilon(0).margin(1e-3));
    }
    SECTION("one thread gives the same bits") {
        const VelocityOffset again = offset_from(draws, n, reference, seed, 1);
        CHECK(again.shift_probability == found.shift_probability);
        CHECK(again.angle_deg.median == found.angle_deg.median);
    }
}

TEST_CASE("an offset that the draws cannot resolve is a limit", "[summary]") {
    const GaussianPrior reference{cmb_velocity(),
                                  3.7e-7 * 3.7e-7 * Eigen::Matrix3d::Identity()};
    const Eigen::Matrix3Xd draws =
        gaussian_draws(cmb_velocity() + Eigen::Vector3d(3e-3, 0, 0), tilted(), 5000);
    const VelocityOffset found = offset_from(draws, 5000, reference, seed, 1);
    CHECK(found.shift_is_limit);
    CHECK(found.shift_probability == Approx(10.0 / 5000.0));
    CHECK(found.sigma > 10.0);
}

TEST_CASE("two lobes are told from none, though their mean is the reference", "[summary]") {
    // Half the draws on either side of the reference, far from it: the Gaussian sees no
    // offset; the draws do.
    const GaussianPrior reference{cmb_velocity(),
                                  3.7e-7 * 3.7e-7 * Eigen::Matrix3d::Identity()};
    const Eigen::Vector3d apart(2e-3, 0, 0);
    Eigen::Matrix3Xd draws(3, 4000);
    draws << gaussian_draws(cmb_velocity() - apart, tilted(), 2000),
        gaussian_draws(cmb_velocity() + apart, tilted(), 2000);
    const VelocityOffset found = offset_from(draws, 4000, reference, seed, 1);
    CHECK(found.sigma < 0.1);
    CHECK(found.shift_sigma > 2.5);
}

TEST_CASE("a velocity along an axis has angle and ratio, and no chi-square", "[summary]") {
    Eigen::Matrix3Xd draws(3, 1000);
    for (Eigen::Index draw = 0; draw < 1000; ++draw)
        draws.col(draw) = (1e-3 + 1e-6 * static_cast<double>(draw)) * Direction::UnitX();
    const GaussianPrior reference{cmb_velocity(), 1e-13 * Eigen::Matrix3d::Identity()};
    const VelocityOffset found = offset_from(draws, 1000, reference, seed, 1);
    CHECK(std::isnan(found.chi2));
    CHECK(std::isnan(found.shift_sigma));
    CHECK(std::isfinite(found.angle_deg.median));
}
