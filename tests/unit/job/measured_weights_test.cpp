// SPDX-License-Identifier: GPL-2.0-or-later
#include <catch2/catch.hpp>
#include <cmath>

#include "job/weights_file.h"
#include "plain_job.h"

using namespace deviascope;

namespace {

const std::string alpha_line = "alpha = { mean = 0.75, sd = 0.2 }\n";
const std::string frame_line = "frame = \"icrs\"\n";

/// The plain job with weights = "measure" and no weight in its first bin.
std::string measuring_job(const std::string& more = alpha_line) {
    return with(with(plain_job, frame_line, frame_line + more + "weights = \"measure\"\n"),
                "weight = { mean = 3.75, sd = 0.05 }\n",
                "");
}

Job job_of(const std::string& text, const std::optional<Companion>& file = {}) {
    return parse_job(text, "j.toml", [&](const std::string& name) {
        return file && name == file->name ? file : std::optional<Companion>();
    });
}

MeasuredWeights measured() {
    MeasuredWeights weights;
    weights.survey = "dunlin";
    weights.replicates = 200;
    weights.covariance = Eigen::MatrixXd::Constant(1, 1, 0.0025);
    BinReport faint;
    faint.name = "faint";
    faint.mean = 3.8125;
    faint.sd = 0.05;
    faint.sources = 12345;
    faint.with_half_windows = std::nan("");
    faint.edges.push_back(
        {"flux", false, 10.0, EdgeMethod::one_sided, 900, 0.5, 0.0, "ln S", 1.8});
    faint.experiment = SkyExperiment{true, 0.19, 0.2, 0.01};
    faint.scatter_free = 3.75;
    weights.bins.push_back(faint);
    weights.warnings.emplace_back("bin faint: a \"quoted\" \\ word");
    weights.scatter_shift = ScatterShift{0.96, 0.98};
    return weights;
}

}  // namespace

TEST_CASE("a survey may ask for measured weights", "[job]") {
    const Job job = job_of(measuring_job());
    REQUIRE(job.weighing.size() == 1);
    const SurveyWeighing& weighing = job.weighing[0];
    CHECK(weighing.asked_for);
    CHECK(weighing.unmeasured);
    CHECK(job.is_unmeasured());
    CHECK(weighing.bins == std::vector<std::size_t>{0});  // the other has a weight of its own
    CHECK(weighing.physics.alpha->mean == 0.75);
    CHECK(weighing.physics.alpha->sd == 0.2);
    CHECK(std::isnan(job.model.surveys[0].weights.mean[0]));
    CHECK(job.model.surveys[0].weights.mean[1] == 4.0);
}

TEST_CASE("measurement scatter is read as numbers or as a multiple of 1+z", "[job]") {
    const Job job = job_of(
        measuring_job(alpha_line + "scatter = { redshift = \"0.05 * (1+z)\", flux = 0.1 }\n"));
    const auto& scatter = job.weighing[0].physics.scatter;
    CHECK(scatter.at("redshift").amount == 0.05);
    CHECK(scatter.at("redshift").times_one_plus_z);
    CHECK(scatter.at("flux").amount == 0.1);
    CHECK_FALSE(scatter.at("flux").times_one_plus_z);
}

TEST_CASE("a job is completed by the weights that were measured for it", "[job]") {
    const Companion file{name_of_measured_weights("dunlin"),
                         "dunlin-weights.toml",
                         weights_file_text(measured(), std::string(64, 'a'))};
    const Job job = job_of(measuring_job(), file);
    CHECK_FALSE(job.is_unmeasured());
    CHECK(job.weighing[0].asked_for);
    const WeightPrior& prior = job.model.surveys[0].weights;
    CHECK(prior.mean[0] == 3.8125);
    CHECK(prior.covariance(0, 0) == 0.0025);
    CHECK(prior.mean[1] == 4.0);  // its own weight overrides
    CHECK(prior.covariance(0, 1) == 0.0);
    REQUIRE(job.companions.size() == 1);
    CHECK(job.companions[0].text == file.text);
    CHECK(digest_in_weights_file(file) == std::string(64, 'a'));
}

TEST_CASE("a measured weights file serves as a weights file", "[job]") {
    const std::string text = weights_file_text(measured(), "0");
    const WeightsFile file = parse_weights({"w", "w.toml", text}, "dunlin");
    CHECK(file.bins == std::vector<std::string>{"faint"});
    CHECK(file.weights.mean[0] == 3.8125);
    CHECK(file.weights.covariance(0, 0) == 0.0025);
    CHECK(text.find("a \\\"quoted\\\" \\\\ word") != std::string::npos);
}

TEST_CASE("weights at edges of flux need a spectral index", "[job]") {
    const auto faults = [](const std::string& text) -> std::string {
        try {
            static_cast<void>(job_of(text));
        } catch (const UsageError& error) {
            return error.what();
        }
        return "";
    };
    CHECK(faults(measuring_job("")) ==
          "j.toml:8:1: survey[1].alpha: missing; to measure weights at edges of flux or "
          "magnitude, alpha = { mean, sd } or a column alpha is required; alpha = 1 for "
          "bolometric fluxes and magnitudes");
    const std::string in_redshift = with(measuring_job(""),
                                         "select = { flux = [10.0, 20.0] }",
                                         "select = { redshift = [0, 1] }");
    CHECK(faults(in_redshift).empty());
}
