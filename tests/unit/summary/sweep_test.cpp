// SPDX-License-Identifier: GPL-2.0-or-later
#include "deviascope/summary/sweep.h"

#include <catch2/catch.hpp>
#include <cmath>

using namespace deviascope;

namespace {

VelocityGaussian velocity(double x, double sd) {
    return {{x, 0.0, 0.0}, sd * sd * Eigen::Matrix3d::Identity()};
}

Sweep example() {
    Sweep sweep;
    sweep.job = "Dunlin";
    SweepRow row;
    row.sources = 1000;
    row.sky_fraction = 0.5;
    row.velocity = velocity(1e-3, 1e-4);
    row.speed = estimate_of({0.9e-3, 1.0e-3, 1.1e-3});
    row.intrinsic = {{"dunlin", estimate_of({1e-3, 2e-3, 3e-3})}};
    sweep.rows = {row, row};
    sweep.rows[1].path = "velocity.prior";
    sweep.rows[1].value = "{ kind = \"fixed\", value = [0, 0, 0] }";
    return sweep;
}

}  // namespace

TEST_CASE("nested fits differ by the difference of their covariances", "[summary]") {
    // A quarter of the data: variance 4, of the difference 3.
    const GaussianDifference found =
        nested_difference(velocity(1e-3 + 3e-4, 2e-4), velocity(1e-3, 1e-4));
    CHECK(found.chi2 == Approx(9e-8 / 3e-8));
    const GaussianDifference turned =
        nested_difference(velocity(1e-3, 1e-4), velocity(1e-3 + 3e-4, 2e-4));
    CHECK(turned.chi2 == Approx(found.chi2));
}

TEST_CASE("fits of the same data have no scatter to be measured in", "[summary]") {
    CHECK(std::isnan(nested_difference(velocity(1.1e-3, 1e-4), velocity(1e-3, 1e-4)).sigma));
    CHECK(std::isnan(nested_difference(velocity(1.1e-3, 1.01e-4), velocity(1e-3, 1e-4)).sigma));
    VelocityGaussian crossed = velocity(1e-3, 1e-4);
    crossed.covariance(0, 0) *= 4.0;
    crossed.covariance(1, 1) *= 0.5;
    CHECK(std::isnan(nested_difference(crossed, velocity(1e-3, 1e-4)).sigma));
}

TEST_CASE("a sweep as CSV quotes what it must", "[summary]") {
    const std::string text = to_csv(example());
    CHECK(text.find("\"{ kind = \"\"fixed\"\", value = [0, 0, 0] }\"") != std::string::npos);
    CHECK(text.find("path,value,sources") == 0);
    CHECK(text.find(",intrinsic_dunlin\n") != std::string::npos);
    CHECK(text.find("nan") == std::string::npos);
}

TEST_CASE("a sweep as JSON has null for what is undefined", "[summary]") {
    const std::string text = to_json(example());
    CHECK(text.find("\"schema\": 1") != std::string::npos);
    CHECK(text.find("\"path\": null") != std::string::npos);
    CHECK(text.find("\"sigma\": null") != std::string::npos);
}

TEST_CASE("a sweep as text fits the page", "[summary]") {
    const std::string text = to_text(example());
    std::size_t from = 0;
    for (std::size_t end; (end = text.find('\n', from)) != std::string::npos; from = end + 1)
        CHECK(end - from <= 100);
    CHECK(text.find("the job as it is") != std::string::npos);
}
