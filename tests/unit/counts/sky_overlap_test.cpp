// SPDX-License-Identifier: GPL-2.0-or-later
#include "deviascope/counts/sky_overlap.h"

#include <catch2/catch.hpp>
#include <cmath>

#include "deviascope/core/physical_constants.h"

using namespace deviascope;

TEST_CASE("shared sky counts a pixel once, whichever bins keep it", "[counts]") {
    Counts counts;
    counts.nside = 1;
    SurveyCounts first, second;
    first.footprints = {{{0, 1, 2, 3}, {1, 1, 1, 1}}, {{3, 4}, {1, 1}}};
    first.bins = {{"a", 0, {10, 0, 20, 30}}, {"b", 1, {5, 7}}};
    second.footprints = {{{2, 3, 4, 11}, {1, 1, 1, 1}}};
    second.bins = {{"c", 0, {100, 200, 300, 400}}};
    counts.surveys = {first, second};
    // nside 1: pixels of pi / 3 sr. A disc of 1 deg radius takes pi r^2 / (pi / 3) of one.
    const double radius = radians_per_degree;
    const double share = 3.0 * radius * radius;
    const SkyOverlap found = sky_overlap(counts, 0, 1, radius);
    CHECK(found.shared_sky_fraction == Approx(3.0 / 12.0));
    CHECK(found.expected_by_chance ==
          Approx(100 * (1 - std::exp(-20 * share)) + 200 * (1 - std::exp(-35 * share)) +
                 300 * (1 - std::exp(-7 * share))));
}

TEST_CASE("surveys apart share nothing", "[counts]") {
    Counts counts;
    counts.nside = 1;
    SurveyCounts first, second;
    first.footprints = {{{0}, {1}}};
    first.bins = {{"a", 0, {10}}};
    second.footprints = {{{1}, {1}}};
    second.bins = {{"b", 0, {10}}};
    counts.surveys = {first, second};
    CHECK(sky_overlap(counts, 0, 1, 1e-3).shared_sky_fraction == 0.0);
    CHECK(sky_overlap(counts, 0, 1, 1e-3).expected_by_chance == 0.0);
}
