// SPDX-License-Identifier: GPL-2.0-or-later
#include "job/weights_file.h"

#include <catch2/catch.hpp>
#include <string>
#include <vector>

#include "plain_job.h"

using namespace deviascope;

namespace {

const std::string joint = R"(survey = "dunlin"
covariance = [[0.0025, 0.001, 0], [0.001, 0.0016, 0], [0, 0, 0]]
[[bin]]
name = "bright"
mean = 3.9
[[bin]]
name = "faint"
mean = 3.7
sd = 0.04
[[bin]]
name = "spare"
mean = 5
)";

/// A job whose bins take their weights from a file of this text.
std::string job_text() {
    std::string text =
        with(plain_job, "frame = \"icrs\"\n", "frame = \"icrs\"\nweights = 'w.toml'\n");
    text = with(text, "weight = { mean = 3.75, sd = 0.05 }\n", "");
    return with(text, "weight = { mean = 4.0, sd = 0.05 }\n", "");
}

CompanionFinder with_file(const std::string& text) {
    return [text](const std::string& name) -> std::optional<Companion> {
        return name == "w.toml" ? std::optional(Companion{name, "w.toml", text})
                                : shipped(name);
    };
}

}  // namespace

TEST_CASE("a weights file gives means and covariance in the job's order of bins", "[job]") {
    const Job job = parsed(job_text(), with_file(joint));
    const WeightPrior& weights = job.model.surveys[0].weights;
    CHECK(weights.mean == Eigen::Vector2d(3.7, 3.9));
    CHECK(weights.covariance == (Eigen::Matrix2d() << 0.0016, 0.001, 0.001, 0.0025).finished());
    CHECK(job.warnings ==
          std::vector<std::string>{
              "survey dunlin: bin spare of the weights file is not used by this job"});
}

TEST_CASE("a bin's own weight stands in for its row of the file", "[job]") {
    const std::string text = with(job_text(),
                                  "name = \"faint\"\n",
                                  "name = \"faint\"\nweight = { mean = 3, sd = 0.5 }\n");
    const WeightPrior weights = parsed(text, with_file(joint)).model.surveys[0].weights;
    CHECK(weights.mean == Eigen::Vector2d(3, 3.9));
    CHECK(weights.covariance == (Eigen::Matrix2d() << 0.25, 0, 0, 0.0025).finished());
}

TEST_CASE("without covariance each bin of a weights file has its own error", "[job]") {
    const WeightsFile file =
        parse_weights({"w",
                       "w.toml",
                       "survey = 'dunlin'\n[[bin]]\nname = 'a'\nmean = 3\nsd = "
                       "0.5\n[[bin]]\nname = 'b'\nmean = 4\nsd = 0\n"},
                      "dunlin");
    CHECK(file.bins == std::vector<std::string>{"a", "b"});
    CHECK(file.weights.mean == Eigen::Vector2d(3, 4));
    CHECK(file.weights.covariance == (Eigen::Matrix2d() << 0.25, 0, 0, 0).finished());
}

TEST_CASE("faults of a weights file are reported with those of the job", "[job]") {
    struct Case {
        const char* from;
        const char* to;
        const char* fault;
    };
    const Case cases[] = {
        {"\"dunlin\"",
         "\"lantern\"",
         "w.toml:1:10: survey: found \"lantern\"; \"dunlin\", whose file this should be, is "
         "allowed"},
        {"sd = 0.04",
         "sd = 0.05",
         "w.toml:9:6: bin[2].sd: found 0.05; 0.04, the root of its variance in the covariance, "
         "is allowed; leave sd out, or correct one of them"},
        {"0.001, 0]",
         "0.002, 0]",
         "w.toml:2:14: covariance: found [[0.0025, 0.002, 0], [0.001, 0.0016, 0], [0, 0, 0]]; "
         "a symmetric matrix is allowed"},
        {"0.0016, 0]",
         "0.0001, 0]",
         "w.toml:2:14: covariance: found [[0.0025, 0.001, 0], [0.001, 0.0001, 0], [0, 0, 0]]; "
         "a positive definite matrix is allowed"},
        {", [0, 0, 0]]",
         "]",
         "w.toml:2:14: covariance: found [[0.0025, 0.001, 0], [0.001, 0.0016, 0]]; an array of "
         "3 rows of 3 finite numbers is allowed"},
        {"name = \"spare\"",
         "name = \"bright\"",
         "w.toml:11:8: bin[3].name: found \"bright\"; each name once is allowed; it is taken "
         "in line 4; choose another"},
        {"mean = 5",
         "maen = 5",
         "w.toml:10:1: bin[3].mean: missing; a finite number is required\nw.toml:12:1: "
         "bin[3].maen: unknown key; known here: \"name\", \"mean\", \"sd\", \"sources\", "
         "\"with_half_windows\", \"with_twice_windows\", \"scatter_free\", "
         "\"experiment\", \"edge\"; did you mean \"mean\"?"},
        {"name = \"faint\"",
         "name = \"fiant\"",
         "j.toml:15:8: survey[1].bin[1].name: bin \"faint\" is not in the survey's weights "
         "file; it has \"bright\", \"fiant\", \"spare\"; did you mean \"fiant\"?"},
        {"survey",
         "= 1\nsurvey",
         "w.toml:1:1: not TOML: in root table: expected keys, tables, whitespace or comments, "
         "saw "
         "'='; a text in TOML 1.0 is allowed"},
    };
    for (const Case& c : cases) {
        INFO(c.from << "  ->  " << c.to);
        CHECK(faults_of(job_text(), with_file(with(joint, c.from, c.to))) == c.fault);
    }
}
