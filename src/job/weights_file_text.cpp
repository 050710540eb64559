// SPDX-License-Identifier: GPL-2.0-or-later
#include <fmt/format.h>
#include <fmt/ranges.h>

#include <cmath>

#include "deviascope/core/version.h"
#include "deviascope/job/job.h"

namespace deviascope {

namespace {

/// A TOML basic string.
std::string quoted(const std::string& text) {
    std::string out = "\"";
    for (const char c : text) {
        if (c == '"' || c == '\\') out += '\\';
        out += c == '\n' ? ' ' : c;
    }
    return out + '"';
}

/// A TOML float that reads back as the same number.
std::string number(double value) {
    const std::string text = fmt::format("{}", value);
    const bool is_float = text.find_first_of(".enif") != std::string::npos;
    return is_float ? text : text + ".0";
}

std::string row_of(const Eigen::MatrixXd& matrix, Eigen::Index row) {
    std::string out;
    for (Eigen::Index column = 0; column < matrix.cols(); ++column)
        out += (column == 0 ? "" : ", ") + number(matrix(row, column));
    return "[" + out + "]";
}

std::string text_of(const EdgeReport& edge) {
    std::string out = "\n[[bin.edge]]\n";
    out += fmt::format("property = {}\n", quoted(edge.property));
    out += fmt::format("side = \"{}\"\n", edge.upper ? "upper" : "lower");
    out += fmt::format("value = {}\n", number(edge.value));
    out += fmt::format("method = {}\n", quoted(name_of(edge.method)));
    out += fmt::format("sources = {}\n", edge.sources);
    out += fmt::format("inside = {}\n", number(edge.inside));
    out += fmt::format("outside = {}\n", number(edge.outside));
    out += fmt::format("unit = {}\n", quoted(edge.unit));
    return out + fmt::format("term = {}\n", number(edge.term));
}

std::string text_of(const SkyExperiment& experiment) {
    std::string out = "\n[bin.experiment]\n";
    if (!experiment.possible) return out + "possible = false\n";
    out += "possible = true\n";
    out += fmt::format("dipole = {}\n", number(experiment.dipole));
    out += fmt::format("expected = {}\n", number(experiment.expected));
    out += fmt::format("sd = {}\n", number(experiment.sd));
    return out + fmt::format("pull = {}\n", number(experiment.pull()));
}

std::string text_of(const BinReport& bin) {
    std::string out = "\n[[bin]]\n";
    out += fmt::format("name = {}\n", quoted(bin.name));
    out += fmt::format("mean = {}\n", number(bin.mean));
    out += fmt::format("sd = {}\n", number(bin.sd));
    out += fmt::format("sources = {}\n", bin.sources);
    // Undefined where the windows cannot be halved or doubled.
    out += fmt::format("with_half_windows = {}\n", number(bin.with_half_windows));
    out += fmt::format("with_twice_windows = {}\n", number(bin.with_twice_windows));
    if (bin.scatter_free) out += fmt::format("scatter_free = {}\n", number(*bin.scatter_free));
    for (const EdgeReport& edge : bin.edges) out += text_of(edge);
    return bin.experiment ? out + text_of(*bin.experiment) : out;
}

}  // namespace

std::string weights_file_text(const MeasuredWeights& weights, const std::string& digest) {
    std::string out = fmt::format(
        "# Kinematic weights of {}, measured from its catalogue by deviascope {}.\n",
        weights.survey,
        version());
    out += fmt::format("survey = {}\n", quoted(weights.survey));
    out += fmt::format("inputs = \"{}\"  # SHA-256 of all that decides them\n", digest);
    out += fmt::format("replicates = {}\n", weights.replicates);
    if (weights.experiment_speed > 0.0)
        out += fmt::format("experiment_speed = {}\n", number(weights.experiment_speed));
    out += "warnings = [";
    for (const std::string& warning : weights.warnings)
        out += fmt::format("\n  {},", quoted(warning));
    out += weights.warnings.empty() ? "]\n" : "\n]\n";
    out += "covariance = [";
    for (Eigen::Index row = 0; row < weights.covariance.rows(); ++row)
        out += fmt::format("\n  {},", row_of(weights.covariance, row));
    out += "\n]\n";
    if (weights.scatter_shift)
        out += fmt::format(
            "\n# Fitted over true velocity, were the scatter-free weights used.\n"
            "[scatter_shift]\nfree_intrinsic = {}\nfree_intrinsic_sd = {}\n"
            "no_intrinsic = {}\nno_intrinsic_sd = {}\n",
            number(weights.scatter_shift->free_intrinsic),
            number(weights.scatter_shift->free_intrinsic_sd),
            number(weights.scatter_shift->no_intrinsic),
            number(weights.scatter_shift->no_intrinsic_sd));
    for (const BinReport& bin : weights.bins) out += text_of(bin);
    return out;
}

}  // namespace deviascope
