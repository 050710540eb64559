// SPDX-License-Identifier: GPL-2.0-or-later
#include <catch2/catch.hpp>
#include <string>
#include <utility>
#include <vector>

#include "deviascope/core/digest.h"
#include "full_job.h"

using namespace deviascope;

TEST_CASE("the digest of inputs follows what decides the counts and nothing else", "[job]") {
    const auto digest = [](const std::string& text, const char* first = "a") {
        const Job job = parsed(text, with_weights);
        std::vector<InputDigest> inputs;
        for (const InputFile& input : job.inputs) {
            inputs.push_back(
                {input.written,
                 digest_of(input.written == "dunlin-north.fits" ? first : input.written),
                 1});
        }
        return digest_of_inputs(job, inputs);
    };
    const std::string job = available_job();
    const std::string same = digest(job);
    for (const auto& [from, to] : std::vector<std::pair<std::string, std::string>>{
             {"seed = 20260817", "seed = 1"},
             {"Dunlin and", "Dunlin or"},
             {"sd = 0.01", "sd = 0.02"},
             {"mean = 3.75", "mean = 3"},
             {"walkers = 144", "walkers = 36"},
             {"dispersion = 1.0", "dispersion = 2.0"},
             {"band = 15.0", "band = 15"}}) {
        INFO(from << " -> " << to);
        CHECK(digest(with(job, from, to)) == same);
    }
    for (const auto& [from, to] : std::vector<std::pair<std::string, std::string>>{
             {"nside = 64", "nside = 32"},
             {"frame = \"galactic\"\n", "frame = \"icrs\"\n"},
             {"name = \"faint\"", "name = \"dim\""},
             {"lon = \"RA\"", "lon = \"RAJ\""},
             {"band = 15.0", "band = 15.000000000000002"},
             {"below = -40.0", "above = -40.0"},
             {"[10.0, 20.0]", "[10.0, 19.0]"},
             {"bad_rows = \"stop\"", "bad_rows = \"skip\""},
             {"table = \"SOURCES\"", "table = 1"},
             {"map_frame = \"galactic\"\n", ""},
             {"\"dunlin-north.fits\", \"dunlin-south.fits\"",
              "\"dunlin-south.fits\", \"dunlin-north.fits\""},
             {"exposure = \"dunlin-faint-exposure.fits\"\n", ""}}) {
        INFO(from << " -> " << to);
        std::string changed = with(job, from, to);
        if (from == "name = \"faint\"")
            changed = with(changed, "weights = \"dunlin-weights.toml\"\n", "");
        CHECK(digest(changed) != same);
    }
    CHECK(digest(job, "b") != same);
}
