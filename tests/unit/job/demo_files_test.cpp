// SPDX-License-Identifier: GPL-2.0-or-later
// The demonstration's job file must say of its bins what its scenario makes of them.
#include <catch2/catch.hpp>
#include <cmath>
#include <fstream>
#include <iterator>

#include "deviascope/job/job.h"
#include "deviascope/job/scenario_file.h"
#include "deviascope/mock/expectation.h"

using namespace deviascope;

namespace {

const std::filesystem::path demo = DEVIASCOPE_SOURCE_FOLDER "/chains-demo";

Job demo_job() {
    std::ifstream file(demo / "dunlin-lantern.toml", std::ios::binary);
    const std::string text{std::istreambuf_iterator<char>(file), {}};
    return parse_job(text, "dunlin-lantern.toml", [](const std::string& name) {
        return find_prior(name, demo);
    });
}

}  // namespace

TEST_CASE("the weights of the demonstration are those of its sources", "[job]") {
    const Scenario scenario = read_scenario(demo / "dunlin-lantern.scenario.toml");
    CHECK(scenario.warnings().empty());
    const Job job = demo_job();
    REQUIRE(job.surveys.size() == scenario.surveys.size());
    for (std::size_t number = 0; number < job.surveys.size(); ++number) {
        const MockSurvey& source = scenario.surveys[number];
        const SurveyInput& survey = job.surveys[number];
        CHECK(survey.name == source.name);
        CHECK(survey.catalogue.front().filename() == source.catalogue_file());
        CHECK(survey.columns.at("lon") == source.lon_column());
        CHECK(survey.frame == source.output.frame);
        for (std::size_t bin = 0; bin < survey.bins.size(); ++bin) {
            const PropertyRange& cut = survey.bins[bin].select.front();
            // A bin in flux lies inside the survey's own limit; one in redshift besides it.
            std::vector<KeptRange> ranges;
            const Property property = *property_of_name(cut.property);
            for (const KeptRange& range : source.keep)
                if (range.property != property) ranges.push_back(range);
            ranges.push_back({property, cut.low, cut.high});
            const double written =
                job.model.surveys[number].weights.mean(static_cast<Eigen::Index>(bin));
            CAPTURE(survey.name, survey.bins[bin].name);
            CHECK(std::abs(written - *expected_weight(source, ranges)) < 5.1e-4);
        }
    }
}
