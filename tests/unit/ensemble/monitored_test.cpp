// SPDX-License-Identifier: GPL-2.0-or-later
#include "deviascope/ensemble/monitored.h"

#include <catch2/catch.hpp>
#include <string>
#include <vector>

using namespace deviascope;

TEST_CASE("sampled parameters, free amplitudes and free directions are watched", "[ensemble]") {
    const std::vector<Parameter> parameters = {
        {"velocity.x", "c", "", Role::sampled},
        {"velocity.y", "c", "", Role::sampled},
        {"velocity.z", "c", "", Role::sampled},
        {"intrinsic.dunlin.x", "1", "", Role::sampled},
        {"intrinsic.dunlin.y", "1", "", Role::sampled},
        {"intrinsic.dunlin.z", "1", "", Role::sampled},
        {"weight.dunlin.faint", "1", "", Role::constant},
        {"monopole.dunlin.faint", "1/sr", "", Role::redrawn}};
    const std::vector<VectorParameter> vectors = {{"velocity", 0, true, true},
                                                  {"intrinsic.dunlin", 3, true, false}};
    std::vector<std::string> names;
    for (const MonitoredScalar& scalar : monitored_scalars(parameters, vectors))
        names.push_back(scalar.name);
    CHECK(names == std::vector<std::string>{"velocity.x",
                                            "velocity.y",
                                            "velocity.z",
                                            "intrinsic.dunlin.x",
                                            "intrinsic.dunlin.y",
                                            "intrinsic.dunlin.z",
                                            "velocity.amplitude",
                                            "velocity.direction.x",
                                            "velocity.direction.y",
                                            "velocity.direction.z",
                                            "intrinsic.dunlin.amplitude"});
}

TEST_CASE("a fixed vector adds nothing to what is watched", "[ensemble]") {
    const std::vector<Parameter> parameters(3, {"v", "c", "", Role::constant});
    CHECK(monitored_scalars(parameters, {{"v", 0, false, false}}).empty());
}

TEST_CASE("values of watched scalars", "[ensemble]") {
    using Kind = MonitoredScalar::Kind;
    const double row[] = {9.0, 2.0, -3.0, 6.0, 0.0, 0.0, 0.0};
    CHECK(MonitoredScalar{"p", Kind::parameter, 2, 0}.value(row) == -3.0);
    CHECK(MonitoredScalar{"a", Kind::amplitude, 1, 0}.value(row) == Approx(7.0));
    CHECK(MonitoredScalar{"d", Kind::direction, 1, 1}.value(row) == Approx(-3.0 / 7.0));
    // A vector of length zero has no direction.
    CHECK(MonitoredScalar{"d", Kind::direction, 4, 2}.value(row) == 0.0);
    // Squares would underflow; the amplitude must not.
    const double tiny[] = {3e-200, 4e-200, 0.0};
    CHECK(MonitoredScalar{"a", Kind::amplitude, 0, 0}.value(tiny) == Approx(5e-200));
}
