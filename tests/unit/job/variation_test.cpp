// SPDX-License-Identifier: GPL-2.0-or-later
#include "deviascope/job/variation.h"

#include <catch2/catch.hpp>

#include "deviascope/core/error.h"
#include "full_job.h"

using namespace deviascope;
using Catch::Matchers::Contains;

namespace {

using Values = std::vector<std::string>;

const std::string small_job = R"(
[job]
seed = 1
nside = 16
[velocity]
prior = "free-velocity"
[[survey]]
name = "dunlin"
exclude = [ { band = 15.0, frame = "galactic" }, { below = -40.0, frame = "icrs" } ]
[[survey.bin]]
name = "faint"
select = { flux = [10.0, inf] }
[[survey]]
name = "lantern"
exclude = [ { band = 20.0, frame = "galactic" } ]
)";

std::size_t count(const std::string& text, const std::string& part) {
    std::size_t n = 0;
    for (std::size_t at = 0; (at = text.find(part, at)) != std::string::npos; ++at) ++n;
    return n;
}

}  // namespace

TEST_CASE("values of a variation", "[job]") {
    CHECK(parse_variation("survey.dunlin.exclude.band=10:30:5").values ==
          Values{"10", "15", "20", "25", "30"});
    CHECK(parse_variation("a=0.1:0.3:0.1").values == Values{"0.1", "0.2", "0.3"});
    CHECK(parse_variation("a=30:10:-10").values == Values{"30", "20", "10"});
    CHECK(parse_variation("a=10:12:5").values == Values{"10"});
    CHECK(parse_variation("velocity.prior=free-velocity,cmb-velocity").values ==
          Values{"free-velocity", "cmb-velocity"});
    CHECK(parse_variation("a=[10, 20],[12, inf]").values == Values{"[10, 20]", "[12, inf]"});
    CHECK(parse_variation("a={ kind = \"gaussian\", sd = 0.1 }").values.size() == 1);
    CHECK(parse_variation("a=5").path == "a");
}

TEST_CASE("variations that say nothing are refused", "[job]") {
    for (const char* written :
         {"a", "=5", "a=", "a=1,,2", "a=1:2:0", "a=1:2:-1", "a=1:x:1", "a=0:1e9:1"})
        CHECK_THROWS_AS(parse_variation(written), UsageError);
}

TEST_CASE("a value is changed where its path leads", "[job]") {
    const std::string band = varied_text(small_job, "survey.dunlin.exclude.band", "25");
    CHECK(count(band, "band = 25") == 1);
    CHECK(count(band, "band = 20.0") == 1);
    CHECK(count(band, "below = -40.0") == 1);
    CHECK(count(varied_text(small_job, "survey.all.exclude.band", "25"), "band = 25") == 2);
    CHECK_THAT(varied_text(small_job, "job.nside", "32"), Contains("nside = 32"));
    CHECK_THAT(varied_text(small_job, "velocity.prior", "cmb-velocity"),
               Contains("prior = \"cmb-velocity\"") || Contains("prior = 'cmb-velocity'"));
    CHECK_THAT(varied_text(small_job, "survey.dunlin.bin.faint.select.flux", "[20.0, inf]"),
               Contains("20.0"));
    CHECK_THAT(varied_text(small_job, "job.frame", "icrs"), Contains("icrs"));
}

TEST_CASE("a path that leads nowhere is refused", "[job]") {
    for (const char* path : {"survey.binnacle.exclude.band",
                             "survey.dunlin.exclude.radius",
                             "velocity.prior.max",
                             "ensemble.tolerance",
                             "survey.dunlin"})
        CHECK_THROWS_AS(varied_text(small_job, path, "1"), UsageError);
}
