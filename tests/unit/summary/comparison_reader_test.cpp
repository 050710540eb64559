// SPDX-License-Identifier: GPL-2.0-or-later
#include <catch2/catch.hpp>
#include <nlohmann/json.hpp>

#include "deviascope/core/error.h"
#include "posed_comparison.h"

using namespace deviascope;
using deviascope::test::posed_comparison;

TEST_CASE("a comparison reads back from its JSON as far as figures need it", "[summary]") {
    const Comparison posed = posed_comparison({"dunlin", "lantern", "binnacle"});
    const Comparison read = comparison_of_json(to_json(posed), "compare.json");
    CHECK(read.fingerprint == posed.fingerprint);
    CHECK(read.reference == posed.reference);
    CHECK(read.reference_velocity == posed.reference_velocity);
    CHECK(read.frame == posed.frame);
    CHECK(read.warnings == posed.warnings);
    REQUIRE(read.hypotheses.size() == posed.hypotheses.size());
    for (std::size_t i = 0; i < read.hypotheses.size(); ++i) {
        const HypothesisResult &one = read.hypotheses[i], &other = posed.hypotheses[i];
        CHECK(one.name == other.name);
        CHECK(one.velocity == other.velocity);
        CHECK(one.intrinsic == other.intrinsic);
        CHECK(one.evidence.bridge.value == other.evidence.bridge.value);
        CHECK(one.evidence.bridge.error == other.evidence.bridge.error);
        CHECK(one.converged == other.converged);
        REQUIRE(one.prior_width.size() == 2);
        CHECK(one.prior_width[1].factor == other.prior_width[1].factor);
        CHECK(one.prior_width[1].log_evidence.value == other.prior_width[1].log_evidence.value);
    }
    REQUIRE(read.alone.size() == 3);
    CHECK(read.alone[2].name == "binnacle");
    CHECK(read.without[0].name == "dunlin");
    CHECK(read.alone[2].velocity.mean == posed.alone[2].velocity.mean);
    CHECK(read.joint.velocity.covariance == posed.joint.velocity.covariance);
    CHECK(read.joint.speed.interval95[1] ==
          Approx(posed.joint.speed.interval95[1]).epsilon(1e-14));
    CHECK(read.joint.offset.sigma == posed.joint.offset.sigma);
    CHECK(read.consistency.sigma == posed.consistency.sigma);
}

TEST_CASE("undefined numbers of a comparison read back as undefined", "[summary]") {
    Comparison posed = posed_comparison({"dunlin", "lantern"});
    posed.alone[0].offset = {};
    posed.alone[0].speed = {};
    posed.consistency.sigma = VelocityOffset::undefined;
    posed.hypotheses[0].evidence.bridge = {};
    const Comparison read = comparison_of_json(to_json(posed), "compare.json");
    CHECK(std::isnan(read.alone[0].offset.sigma));
    CHECK(std::isnan(read.alone[0].speed.interval68[0]));
    CHECK(std::isnan(read.consistency.sigma));
    CHECK(std::isnan(read.hypotheses[0].evidence.bridge.value));
}

TEST_CASE("a file that compare did not write is refused in words", "[summary]") {
    const std::string whole = to_json(posed_comparison({"dunlin", "lantern"}));
    CHECK_THROWS_WITH(comparison_of_json(whole.substr(0, whole.size() / 2), "c.json"),
                      Catch::StartsWith("c.json: not what compare writes") &&
                          Catch::Contains("make it again"));
    CHECK_THROWS_AS(comparison_of_json("[1]", "c.json"), InputError);
    nlohmann::json other = nlohmann::json::parse(whole);
    other["schema"] = 2;
    CHECK_THROWS_WITH(comparison_of_json(other.dump(), "c.json"),
                      "c.json: schema 2; schema 1 is allowed");
    other["schema"] = 1;
    other.erase("surveys");
    CHECK_THROWS_AS(comparison_of_json(other.dump(), "c.json"), InputError);
    other["surveys"] = "none";
    CHECK_THROWS_AS(comparison_of_json(other.dump(), "c.json"), InputError);
}
