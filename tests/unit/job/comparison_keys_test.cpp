// SPDX-License-Identifier: GPL-2.0-or-later
// What a job says for comparisons: hypotheses, deduplication, dispersions to be measured.
#include <algorithm>
#include <catch2/catch.hpp>

#include "deviascope/core/error.h"
#include "deviascope/job/dispersion_file.h"
#include "plain_job.h"

using namespace deviascope;

namespace {

/// The plain job with two more surveys like its first.
std::string three_surveys() {
    const std::string first = plain_job.substr(plain_job.find("[[survey]]"));
    return plain_job + with(first, "\"dunlin\"", "\"lantern\"") +
           with(first, "\"dunlin\"", "\"gnomon\"");
}

std::string deduplicated(const std::string& value) {
    return with(three_surveys(), "seed = 1", "seed = 1\ndeduplicate = " + value);
}

}  // namespace

TEST_CASE("hypotheses are kept with their priors", "[job]") {
    const Job job =
        parsed(plain_job +
               "[[hypothesis]]\nname = \"still\"\nvelocity = { prior = "
               "\"no-motion\" }\n[[hypothesis]]\nname = \"one-dipole\"\nintrinsic = "
               "{ shared = true, prior = { kind = \"gaussian\", sd = 0.02 } }\n");
    REQUIRE(job.hypotheses.size() == 2);
    CHECK(job.hypotheses[0].name == "still");
    CHECK(job.hypotheses[0].velocity->n_coordinates() == 0);
    CHECK_FALSE(job.hypotheses[0].intrinsic);
    CHECK_FALSE(job.hypotheses[1].velocity);
    CHECK(job.hypotheses[1].intrinsic_shared);
    CHECK(job.hypotheses[1].intrinsic->covariance()(0, 0) == Approx(4e-4));
}

TEST_CASE("deduplication names two surveys of the job", "[job]") {
    const Job job = parsed(deduplicated("[\"lantern over gnomon\", \"dunlin over lantern\"]"));
    REQUIRE(job.deduplicate.size() == 2);
    CHECK(job.deduplicate[0].first == 1);
    CHECK(job.deduplicate[0].second == 2);
    CHECK(job.match_arcsec == 5.0);
    const auto digest = [](const Job& one) {
        return digest_of_inputs(one, std::vector<InputDigest>(one.inputs.size()));
    };
    CHECK(digest(job) != digest(parsed(three_surveys())));
}

TEST_CASE("deduplication that cannot be carried out is refused", "[job]") {
    CHECK_THAT(faults_of(deduplicated("[\"dunlin over dunlin\"]")),
               Catch::Contains("two surveys of the job"));
    CHECK_THAT(faults_of(deduplicated("[\"dunlin under lantern\"]")),
               Catch::Contains("two surveys of the job"));
    CHECK_THAT(faults_of(deduplicated("[\"dunlin over lantern\", \"lantern over gnomon\", "
                                      "\"gnomon over dunlin\"]")),
               Catch::Contains("\"gnomon over dunlin\", which closes a circle"));
}

TEST_CASE("a dispersion to be measured is 1 until it is", "[job]") {
    Job job = parsed(with(plain_job,
                          "weight = { mean = 4.0, sd = 0.05 }",
                          "weight = { mean = 4.0, sd = 0.05 }\ndispersion = \"measure\""));
    REQUIRE(job.measure_dispersion.size() == 1);
    CHECK(job.measure_dispersion[0].bin == 1);
    CHECK(job.model.surveys[0].bins[1].dispersion == 1.0);
    const Companion file = dispersion_file(job, {{job.measure_dispersion[0], 1.3125, 0.0211}});
    adopt_dispersion(job, file);
    adopt_dispersion(job, file);
    CHECK(job.model.surveys[0].bins[1].dispersion == 1.3125);
    CHECK(job.model.surveys[0].bins[0].dispersion == 1.0);
    CHECK(std::ranges::count(job.companions, file.name, &Companion::name) == 1);
    SECTION("of another job's bins it is refused") {
        Job other = parsed(plain_job);
        CHECK_THROWS_AS(adopt_dispersion(other, file), UsageError);
    }
}
