// SPDX-License-Identifier: GPL-2.0-or-later
#include "job/weights_file.h"

#include <fmt/format.h>

#include <cmath>
#include <optional>

#include "deviascope/job/job.h"
#include "job/covariance_rule.h"
#include "job/name_rule.h"
#include "job/toml_reader.h"

namespace deviascope {

namespace {

void check_survey(const TomlTable& root, const std::string& survey) {
    const auto written = root.text("survey", required);
    if (!written || survey.empty() || *written == survey) return;
    root.wrong("survey", fmt::format("\"{}\", whose file this should be,", survey));
}

/// Standard deviations beside a covariance have to say the same.
void check_agreement(const std::vector<TomlTable>& bins, const Eigen::MatrixXd& covariance) {
    for (std::size_t b = 0; b < bins.size(); ++b) {
        const auto sd = bins[b].number("sd", at_least(0));
        const auto row = static_cast<Eigen::Index>(b);
        const double expected = std::sqrt(covariance(row, row));
        if (!sd || std::abs(*sd - expected) <= 1e-6 * expected) continue;
        bins[b].wrong(
            "sd",
            fmt::format("{:.7g}, the root of its variance in the covariance,", expected),
            "leave sd out, or correct one of them");
    }
}

/// What a measured file says besides means and covariance: for people, idle here.
void pass_over_reports(const TomlTable& root) {
    for (const char* key : {"inputs", "replicates", "experiment_speed", "warnings"})
        root.has(key);
    root.table("scatter_shift").ignore_unknown_keys();
}

void pass_over_reports_of_bin(const TomlTable& bin) {
    for (const char* key :
         {"sources", "with_half_windows", "with_twice_windows", "scatter_free"})
        bin.has(key);
    bin.table("experiment").ignore_unknown_keys();
    for (const TomlTable& edge : bin.tables("edge")) edge.ignore_unknown_keys();
}

}  // namespace

std::string digest_in_weights_file(const Companion& file) {
    TomlDocument document(file.text, file.path);
    return document.root().text("inputs").value_or("");
}

WeightsFile parse_weights(const Companion& companion, const std::string& survey) {
    TomlDocument document(companion.text, companion.path);
    const TomlTable root = document.root();
    check_survey(root, survey);
    WeightsFile file;
    const auto bins = root.tables("bin", required);
    const auto n = std::ssize(bins);
    file.weights.mean = Eigen::VectorXd::Zero(n);
    file.weights.covariance = Eigen::MatrixXd::Zero(n, n);
    const bool joint = root.has("covariance");
    NameRule names;
    for (Eigen::Index b = 0; b < n; ++b) {
        const TomlTable& bin = bins[static_cast<std::size_t>(b)];
        file.bins.push_back(names.read(bin));
        file.weights.mean(b) = bin.number("mean", {}, required).value_or(0.0);
        if (joint) continue;
        const double sd = bin.number("sd", at_least(0), required).value_or(0.0);
        file.weights.covariance(b, b) = sd * sd;
    }
    if (joint) {
        const auto covariance = read_covariance(root, "covariance", n, required, true);
        file.weights.covariance = covariance.value_or(file.weights.covariance);
        if (covariance) check_agreement(bins, *covariance);
        for (const TomlTable& bin : bins) bin.has("sd");
    }
    pass_over_reports(root);
    for (const TomlTable& bin : bins) pass_over_reports_of_bin(bin);
    document.finish();
    return file;
}

}  // namespace deviascope
