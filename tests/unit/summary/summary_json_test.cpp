// SPDX-License-Identifier: GPL-2.0-or-later
#include <catch2/catch.hpp>
#include <nlohmann/json.hpp>

#include "example_summary.h"

using namespace deviascope;
using Json = nlohmann::ordered_json;

namespace {

/// The agreed form of summary.json, schema 1. Numbers stand for their place alone.
const char* const schema = R"({
"schema": 1, "job": "", "frame": "galactic",
"velocity": {"prior": "", "prior_median_amplitude": 0,
  "amplitude": {"median": 0, "mean": 0, "sd": 0, "interval68": [0,0], "interval95": [0,0]},
  "speed_km_s": {"median": 0, "mean": 0, "sd": 0, "interval68": [0,0], "interval95": [0,0]},
  "vector": {"mean": [0,0,0], "covariance": [[0,0,0],[0,0,0],[0,0,0]]},
  "direction": {"galactic": {"lon_deg": 0, "lat_deg": 0}, "icrs": {"lon_deg": 0, "lat_deg": 0},
    "region68": {"area_deg2": 0, "radius_deg": 0}, "region95": {"area_deg2": 0, "radius_deg": 0}},
  "offset_from_cmb": {"angle_deg": {"median": 0, "interval68": [0,0]},
    "speed_ratio": {"median": 0, "interval68": [0,0]}}},
"intrinsic": {"dunlin": {"prior": "", "prior_median_amplitude": 0,
  "amplitude": {"median": 0, "mean": 0, "sd": 0, "interval68": [0,0], "interval95": [0,0]},
  "vector": {"mean": [0,0,0], "covariance": [[0,0,0],[0,0,0],[0,0,0]]},
  "direction": {"galactic": {"lon_deg": 0, "lat_deg": 0}, "icrs": {"lon_deg": 0, "lat_deg": 0},
    "region68": {"area_deg2": 0, "radius_deg": 0},
    "region95": {"area_deg2": 0, "radius_deg": 0}}}},
"bins": [{"survey": "dunlin", "bin": "faint", "sources": 0, "pixels": 0, "sky_fraction": 0,
  "monopole": {"median": 0, "interval68": [0,0]},
  "weight": {"median": 0, "interval68": [0,0], "prior_mean": 0, "prior_sd": 0}}],
"weight_modes": {"dunlin": {"common": {"mean": 0, "sd": 0, "prior_sd": 0},
  "differential": {"mean": 0, "sd": 0, "prior_sd": 0, "false_dipole": 0}}},
"separation": {"dunlin": {"weight_spread": 0, "velocity_prior_share": 0, "verdict": ""},
  "joint": {"velocity_prior_share": 0, "verdict": ""}},
"sampling": {"converged": true, "replicates": 4, "walkers": 144, "steps": 0, "discarded": 0,
  "store_every": 1, "walker_rhat_max": 0, "replicate_rhat_max": 0, "effective_draws_min": 0,
  "autocorrelation_steps_max": 0,
  "kernels": {"stretch": {"tried": 0, "taken": 0},
    "differential-evolution": {"tried": 0, "taken": 0},
    "independence": {"tried": 0, "taken": 0}},
  "engine": {"moment": 0, "pixel": 0}},
"warnings": []
})";

/// A summary of one survey, one bin and no warning, as the form shows.
Summary single() {
    Summary summary = example::summary();
    summary.intrinsic.resize(1);
    summary.bins.resize(1);
    summary.weight_modes = {{{1.001, 0.004, 0.005}, {0.01, 0.02, 0.03}}};
    summary.separation.surveys.resize(1);
    summary.cuts.resize(1);
    summary.survey_names.resize(1);
    summary.warnings.clear();
    return summary;
}

/// Keys in their order, array sizes and kinds of values; `null` fits everywhere if allowed.
void compare(const Json& found, const Json& form, const std::string& place, bool allow_null) {
    CAPTURE(place);
    if (allow_null && found.is_null()) return;
    if (form.is_number()) {
        CHECK(found.is_number());
        return;
    }
    REQUIRE(std::string(found.type_name()) == form.type_name());
    if (!form.is_structured()) return;
    REQUIRE(found.size() == form.size());
    for (auto expected = form.begin(), actual = found.begin(); expected != form.end();
         ++expected, ++actual) {
        if (form.is_object()) REQUIRE(actual.key() == expected.key());
        compare(*actual,
                *expected,
                place + "/" + (form.is_object() ? actual.key() : "[]"),
                allow_null);
    }
}

}  // namespace

TEST_CASE("summary.json has the keys of schema 1 in their order, and no others", "[summary]") {
    compare(Json::parse(to_json(single())), Json::parse(schema), "", false);
}

TEST_CASE("several surveys, bins and warnings in summary.json", "[summary]") {
    const Json json = Json::parse(to_json(example::summary()));
    CHECK(json["intrinsic"].size() == 2);
    CHECK(json["intrinsic"].contains("lantern"));
    CHECK(json["bins"].size() == 3);
    CHECK(json["bins"][1]["bin"] == "bright");
    CHECK(json["separation"].size() == 3);
    CHECK(json["separation"]["lantern"]["velocity_prior_share"] == 0.998);
    CHECK(json["warnings"].size() == 2);
    CHECK(json["sampling"]["kernels"]["differential-evolution"]["taken"] == 530841);
}

TEST_CASE("numbers of summary.json come back with the same bits", "[summary]") {
    Summary summary = single();
    summary.velocity.amplitude.median = 0.1 + 0.2;
    summary.velocity.mean[1] = -1.0 / 3.0 * 1e-7;
    const Json json = Json::parse(to_json(summary));
    CHECK(json["velocity"]["amplitude"]["median"].get<double>() == 0.1 + 0.2);
    CHECK(json["velocity"]["vector"]["mean"][1].get<double>() == -1.0 / 3.0 * 1e-7);
    // Speed of light: 299 792.458 km/s, exact (BIPM 2019).
    CHECK(json["velocity"]["speed_km_s"]["median"].get<double>() == (0.1 + 0.2) * 299792.458);
}

TEST_CASE("what is undefined or constant is null in summary.json", "[summary]") {
    Summary summary = single();
    summary.velocity.amplitude_free = false;
    summary.velocity.direction_free = false;
    summary.velocity.amplitude = estimate_of({0.0, 0.0});
    summary.velocity.region68.reset();
    summary.velocity.region95.reset();
    summary.offset_from_cmb.reset();
    summary.intrinsic = {example::unseen("dunlin")};
    summary.bins[0].weight = estimate_of({3.75, 3.75});
    summary.weight_modes = {{{1.0, 0.0, 0.0}, {0.0, 0.0, 0.0}}};
    summary.separation.joint.velocity_prior_share.reset();
    summary.sampling.walker_rhat_max = std::numeric_limits<double>::quiet_NaN();
    const Json json = Json::parse(to_json(summary));
    compare(json, Json::parse(schema), "", true);
    CHECK(json["velocity"]["amplitude"]["median"].is_null());
    CHECK(json["velocity"]["amplitude"]["interval95"].is_null());
    CHECK(json["velocity"]["speed_km_s"]["sd"].is_null());
    CHECK(json["velocity"]["vector"]["covariance"].is_null());
    CHECK(json["velocity"]["direction"]["icrs"]["lon_deg"].is_null());
    CHECK(json["velocity"]["direction"]["region68"]["area_deg2"].is_null());
    CHECK(json["velocity"]["offset_from_cmb"]["angle_deg"]["median"].is_null());
    CHECK(json["intrinsic"]["dunlin"]["direction"]["galactic"]["lon_deg"].is_null());
    CHECK(json["intrinsic"]["dunlin"]["direction"]["region68"]["area_deg2"] == 21300.0);
    CHECK(json["intrinsic"]["dunlin"]["direction"]["region68"]["radius_deg"].is_null());
    CHECK(json["bins"][0]["weight"]["median"].is_null());
    CHECK(json["bins"][0]["weight"]["prior_mean"] == 3.75);
    CHECK(json["weight_modes"]["dunlin"]["common"]["mean"].is_null());
    CHECK(json["weight_modes"]["dunlin"]["differential"]["false_dipole"].is_null());
    CHECK(json["separation"]["joint"]["velocity_prior_share"].is_null());
    CHECK(json["sampling"]["walker_rhat_max"].is_null());
}

TEST_CASE("a title that is no UTF-8 does not spoil summary.json", "[summary]") {
    Summary summary = single();
    summary.job = "bad \xff title";
    CHECK_NOTHROW(Json::parse(to_json(summary)));
}
