// SPDX-License-Identifier: GPL-2.0-or-later
#include <catch2/catch.hpp>
#include <fstream>
#include <sstream>

#include "example_summary.h"

using namespace deviascope;

namespace {

std::string expected_text() {
    std::ifstream file(DEVIASCOPE_TEST_DATA "/unit/summary/expected-summary.txt");
    std::ostringstream text;
    text << file.rdbuf();
    return text.str();
}

/// Letters (UTF-8 code points) of the longest line.
std::size_t longest_line(const std::string& text) {
    std::size_t longest = 0, length = 0;
    for (const char byte : text) {
        if ((static_cast<unsigned char>(byte) & 0xC0u) != 0x80u) ++length;
        if (byte == '\n') length = 0;
        longest = std::max(longest, length);
    }
    return longest;
}

bool has_line_with(const std::string& text,
                   const std::string& first,
                   const std::string& second) {
    std::istringstream lines(text);
    for (std::string line; std::getline(lines, line);)
        if (line.find(first) != std::string::npos && line.find(second) != std::string::npos)
            return true;
    return false;
}

}  // namespace

TEST_CASE("the text of a summary as a whole", "[summary]") {
    CHECK(to_text(example::summary()) == expected_text());
}

TEST_CASE("estimates and diagnostics never share a table", "[summary]") {
    const std::string text = to_text(example::summary());
    const std::size_t border = text.find("Convergence of the sampler");
    REQUIRE(border != std::string::npos);
    const std::string estimates = text.substr(0, border), sampling = text.substr(border);
    for (const char* word : {"R-hat", "effective", "correlation", "replicates"})
        CHECK(estimates.find(word) == std::string::npos);
    for (const char* word : {"median", "interval", "km/s", "deg"})
        CHECK(sampling.find(word) == std::string::npos);
    CHECK(has_line_with(sampling, "velocity.y", "1.0015"));
    CHECK(has_line_with(sampling, "velocity.y", "15 185"));
}

TEST_CASE("warnings stand before every estimate", "[summary]") {
    const std::string text = to_text(example::summary());
    CHECK(text.find("WARNINGS (2)") < text.find("Velocity of the observer"));
    Summary quiet = example::summary();
    quiet.warnings.clear();
    CHECK(to_text(quiet).find("No warnings.") != std::string::npos);
}

TEST_CASE("an amplitude that is not told from zero has its limit beside it", "[summary]") {
    Summary summary = example::summary();
    summary.velocity.amplitude_limits = UpperLimits{4e-4, 1.2345e-3};
    summary.intrinsic[1].amplitude_limits = UpperLimits{1.6e-3, 3.456e-3};
    const std::string text = to_text(summary);
    CHECK(
        has_line_with(text, "Not told from zero", "95.45 % of the draws lie below 370 km/s."));
    CHECK(has_line_with(text, "Not told from zero", "lie below 3.46 x 10^-3."));
    CHECK(to_text(example::summary()).find("Not told from zero") == std::string::npos);
}

TEST_CASE("long names and titles keep to the page", "[summary]") {
    Summary summary = example::summary();
    summary.job.assign(150, 'T');
    summary.job += " \u00e9t\u00e9";
    summary.survey_names[0] = std::string(90, 's');
    summary.intrinsic[0].name = summary.survey_names[0];
    summary.intrinsic[0].prior = std::string(130, 'p');
    summary.bins[0].survey = summary.survey_names[0];
    summary.cuts[0].cuts[0].name = std::string(140, 'c');
    summary.sampling.scalars[0].name = "intrinsic." + summary.survey_names[0] + ".amplitude";
    summary.warnings[0] = std::string(250, 'w');
    CHECK(longest_line(to_text(summary)) <= 100);
    CHECK(longest_line(to_text(example::summary())) <= 100);
    summary.job = "\u00e9t\u00e9";
    CHECK_THAT(to_text(summary), Catch::StartsWith("\u00e9t\u00e9\n===\n"));
}

TEST_CASE("a fixed vector, a fixed direction and one nowhere in particular", "[summary]") {
    Summary summary = example::summary();
    summary.velocity.amplitude_free = false;
    summary.velocity.direction_free = false;
    summary.velocity.prior = "no-motion";
    summary.velocity.prior_description = "fixed at length 0 c";
    summary.offset_from_cmb.reset();
    summary.intrinsic[0].direction_free = false;
    summary.intrinsic[0].region68.reset();
    summary.intrinsic[0].region95.reset();
    const std::string text = to_text(summary);
    CHECK(text.find("Prior no-motion: fixed at length 0 c.") != std::string::npos);
    CHECK(text.find("km/s") == std::string::npos);
    CHECK(text.find("CMB") == std::string::npos);
    CHECK(text.find("The direction is fixed by the prior.") != std::string::npos);
    CHECK(text.find("No direction to speak of") != std::string::npos);
}

TEST_CASE("a table of cuts adds up in print", "[summary]") {
    CutReport cuts = example::cuts(2000000, 1580245);
    CHECK(cut_table("dunlin", cuts) ==
          "Cuts of dunlin\n"
          "--------------\n"
          "                           catalogue rows    pixels\n"
          "  read, and on the grid         2 000 000    49 152\n"
          "  band 20 deg (galactic)         -418 521   -16 640\n"
          "  in no bin                        -1 234         0\n"
          "  -------------------------------------------------\n"
          "  kept                          1 580 245    32 512\n");
}
