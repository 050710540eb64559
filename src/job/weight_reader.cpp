// SPDX-License-Identifier: GPL-2.0-or-later
#include "job/weight_reader.h"

#include <fmt/format.h>

#include <algorithm>
#include <cmath>
#include <limits>
#include <map>
#include <utility>

#include "job/weights_file.h"

namespace deviascope {

namespace {

/// A weight as one bin quotes it.
struct QuotedWeight {
    double mean = 0.0, sd = 0.0;
    std::optional<std::pair<double, double>> alpha;  ///< mean and sd, where it comes from them
};

std::optional<QuotedWeight> read_direct(const TomlTable& weight) {
    const auto mean = weight.number("mean", {}, required);
    const auto sd = weight.number("sd", at_least(0), required);
    return mean && sd ? std::optional(QuotedWeight{*mean, *sd, {}}) : std::nullopt;
}

std::optional<QuotedWeight> read_from_slope(const TomlTable& weight) {
    const auto x = weight.number("x", {}, required);
    const auto x_sd = weight.number("x_sd", at_least(0), required);
    const auto alpha = weight.number("alpha", {}, required);
    const auto alpha_sd = weight.number("alpha_sd", at_least(0), required);
    if (!x || !x_sd || !alpha || !alpha_sd) return std::nullopt;
    return QuotedWeight{2 + *x * (1 + *alpha),
                        std::hypot((1 + *alpha) * *x_sd, *x * *alpha_sd),
                        std::pair(*alpha, *alpha_sd)};
}

bool has_any(const TomlTable& table, const std::vector<std::string>& keys) {
    return std::count_if(
               keys.begin(), keys.end(), [&](const auto& key) { return table.has(key); }) > 0;
}

const char* const weight_forms = "a table { mean, sd } or { x, x_sd, alpha, alpha_sd }";

std::optional<QuotedWeight> read_quoted(const TomlTable& bin) {
    if (!bin.has_table("weight")) {
        const bool measured = bin.has_text("weight") && bin.text("weight") == "measure";
        bin.wrong(
            "weight",
            weight_forms,
            measured ? "leave it out, and write weights = \"measure\" in the survey" : "");
        return std::nullopt;
    }
    const TomlTable weight = bin.table("weight");
    const bool direct = has_any(weight, {"mean", "sd"});
    const bool from_slope = has_any(weight, {"x", "x_sd", "alpha", "alpha_sd"});
    if (direct && !from_slope) return read_direct(weight);
    if (from_slope && !direct) return read_from_slope(weight);
    weight.fault_here(direct ? "both forms of a weight" : "no weight",
                      fmt::format("{} is {}", weight_forms, direct ? "allowed" : "required"),
                      direct ? "leave one of them out" : "");
    return std::nullopt;
}

bool asks_to_measure(const TomlTable& survey) {
    return survey.has_text("weights") && survey.text("weights") == "measure";
}

/// The file that the survey names, or the measured one.
std::optional<WeightsFile> read_file(const TomlTable& survey,
                                     const std::string& survey_name,
                                     Surroundings& surroundings) {
    if (!surroundings.needs_weights()) {
        survey.text("weights");
        return std::nullopt;
    }
    const auto companion = asks_to_measure(survey)
                               ? surroundings.measured_weights(survey_name)
                               : surroundings.read_companion(survey, "weights");
    if (!companion) return std::nullopt;
    try {
        return parse_weights(*companion, survey_name);
    } catch (const UsageError& error) {
        survey.adopt("weights", error.messages());
        return std::nullopt;
    }
}

/// Builds the joint prior bin by bin.
class WeightBuilder {
  public:
    WeightBuilder(const TomlTable& survey,
                  const std::string& survey_name,
                  const std::vector<TomlTable>& bins,
                  const std::vector<std::string>& names,
                  Surroundings& surroundings)
        : survey_(survey),
          survey_name_(survey_name),
          bins_(bins),
          names_(names),
          promised_(survey.has("weights") || !surroundings.needs_weights()),
          measure_(asks_to_measure(survey)),
          needs_weights_(surroundings.needs_weights()),
          file_(read_file(survey, survey_name, surroundings)),
          quoted_(bins.size()),
          row_(bins.size()) {}

    WeightReading build() {
        for (std::size_t b = 0; b < bins_.size(); ++b) read_bin(b);
        warn_of_shared_alpha();
        warn_of_idle_rows();
        reading_.measure = measure_;
        for (std::size_t b = 0; b < bins_.size(); ++b)
            reading_.unmeasured = reading_.unmeasured || is_unmeasured(b);
        if (complete_) {
            reading_.prior = joint_prior();
            warn_of_amplitudes();
        }
        return std::move(reading_);
    }

  private:
    void read_bin(std::size_t b) {
        const TomlTable& bin = bins_[b];
        if (bin.has("weight")) {
            quoted_[b] = read_quoted(bin);
        } else if (file_) {
            row_[b] = row_of(b);
        } else if (measure_ && bin.has("counts")) {
            bin.fault("weight",
                      "missing",
                      "a bin with a count map has no sources to measure its weight from",
                      fmt::format("give it as {}", weight_forms));
        } else if (!promised_) {
            bin.fault(
                "weight",
                "missing",
                fmt::format("{} is required", weight_forms),
                "or name a weights file in the survey's weights, or write \"measure\" there");
        }
        complete_ = complete_ && (quoted_[b] || row_[b] || is_unmeasured(b));
    }

    /// Whether a weight is still to be measured; what else is wrong with the bin is a fault.
    bool is_unmeasured(std::size_t b) const {
        return !file_ && !bins_[b].has("weight") && (measure_ || !needs_weights_);
    }

    std::optional<Eigen::Index> row_of(std::size_t b) const {
        const auto& known = file_->bins;
        const auto found = std::find(known.begin(), known.end(), names_[b]);
        if (found != known.end()) return found - known.begin();
        if (names_[b].empty()) return std::nullopt;
        bins_[b].fault("name",
                       fmt::format("bin \"{}\" is not in the survey's weights file", names_[b]),
                       "it has " + listed(known, ", "),
                       suggestion(names_[b], known));
        return std::nullopt;
    }

    WeightPrior joint_prior() const {
        const auto n = std::ssize(bins_);
        WeightPrior prior{Eigen::VectorXd::Zero(n), Eigen::MatrixXd::Zero(n, n)};
        for (std::size_t b = 0; b < bins_.size(); ++b) {
            const auto i = static_cast<Eigen::Index>(b);
            if (is_unmeasured(b)) {
                prior.mean(i) = std::numeric_limits<double>::quiet_NaN();
                prior.covariance(i, i) =
                    1.0;  // a coordinate of the sampler, whatever its width
                continue;
            }
            prior.mean(i) = row_[b] ? file_->weights.mean(*row_[b]) : quoted_[b]->mean;
            if (!row_[b]) prior.covariance(i, i) = quoted_[b]->sd * quoted_[b]->sd;
            for (std::size_t c = 0; row_[b] && c < bins_.size(); ++c) {
                if (!row_[c]) continue;
                prior.covariance(i, static_cast<Eigen::Index>(c)) =
                    file_->weights.covariance(*row_[b], *row_[c]);
            }
        }
        return prior;
    }

    void warn_of_shared_alpha() {
        std::map<std::pair<double, double>, std::vector<std::string>> bins_of_alpha;
        for (std::size_t b = 0; b < bins_.size(); ++b) {
            const bool uncertain =
                quoted_[b] && quoted_[b]->alpha && quoted_[b]->alpha->second > 0;
            if (uncertain) bins_of_alpha[*quoted_[b]->alpha].push_back(names_[b]);
        }
        for (const auto& [alpha, names] : bins_of_alpha) {
            if (names.size() < 2) continue;
            reading_.warnings.push_back(fmt::format(
                "survey {}: bins {} quote the same alpha {} +- {}, so they share its error, "
                "but "
                "their weights are taken as independent; give the survey a weights file with "
                "their covariance",
                survey_name_,
                fmt::join(names, ", "),
                alpha.first,
                alpha.second));
        }
    }

    /// Amplitudes of dipoles are far below 0.1; kinematic weights seldom are.
    void warn_of_amplitudes() {
        for (std::size_t b = 0; b < bins_.size(); ++b) {
            const double mean = reading_.prior->mean(static_cast<Eigen::Index>(b));
            if (mean == 0.0 || !(std::abs(mean) < 0.1)) continue;
            reading_.warnings.push_back(fmt::format(
                "survey {}: bin {}: the weight {} looks like the amplitude of a dipole; the "
                "kinematic weight of a flux-limited sample is 2 + x (1 + alpha), about 4",
                survey_name_,
                names_[b],
                mean));
        }
    }

    void warn_of_idle_rows() {
        if (!file_) return;
        for (std::size_t row = 0; row < file_->bins.size(); ++row) {
            const bool used =
                std::find(row_.begin(), row_.end(), static_cast<Eigen::Index>(row)) !=
                row_.end();
            if (used) continue;
            reading_.warnings.push_back(
                fmt::format("survey {}: bin {} of the weights file is not used by this job",
                            survey_name_,
                            file_->bins[row]));
        }
    }

    TomlTable survey_;
    const std::string& survey_name_;
    const std::vector<TomlTable>& bins_;
    const std::vector<std::string>& names_;
    bool promised_;
    bool measure_;
    bool needs_weights_;
    std::optional<WeightsFile> file_;
    std::vector<std::optional<QuotedWeight>> quoted_;
    std::vector<std::optional<Eigen::Index>> row_;
    bool complete_ = true;
    WeightReading reading_;
};

}  // namespace

WeightReading read_weights(const TomlTable& survey,
                           const std::string& survey_name,
                           const std::vector<TomlTable>& bins,
                           const std::vector<std::string>& names,
                           Surroundings& surroundings) {
    return WeightBuilder(survey, survey_name, bins, names, surroundings).build();
}

}  // namespace deviascope
