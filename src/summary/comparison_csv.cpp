// SPDX-License-Identifier: GPL-2.0-or-later
#include <fmt/format.h>

#include <cmath>

#include "deviascope/core/physical_constants.h"
#include "deviascope/summary/comparison.h"
#include "summary/rounding.h"

namespace deviascope {
namespace {

/// Lines `table,row,quantity,value,error`; what is undefined is empty.
class Lines {
  public:
    void add(const std::string& table,
             const std::string& row,
             const std::string& quantity,
             double value,
             double error = VelocityOffset::undefined) {
        text_ += fmt::format(
            "{},{},{},{},{}\n", table, row, quantity, csv_number(value), csv_number(error));
    }
    const std::string& text() const { return text_; }

  private:
    std::string text_ = "table,row,quantity,value,error\n";
};

void add_fit(Lines& lines, const std::string& row, const SurveyFit& fit) {
    const char* table = "velocity";
    for (Eigen::Index axis = 0; axis < 3; ++axis)
        lines.add(table,
                  row,
                  std::string("velocity.") + "xyz"[axis],
                  fit.velocity.mean[axis],
                  std::sqrt(fit.velocity.covariance(axis, axis)));
    lines.add(table,
              row,
              "speed_km_s",
              fit.speed.median * speed_of_light_km_s,
              fit.speed.sd * speed_of_light_km_s);
    lines.add(table, row, "offset_chi2", fit.offset.chi2);
    lines.add(table, row, "offset_sigma", fit.offset.sigma);
    lines.add(table, row, "angle_deg", fit.offset.angle_deg.median, fit.offset.angle_deg.sd);
    lines.add(
        table, row, "speed_ratio", fit.offset.speed_ratio.median, fit.offset.speed_ratio.sd);
    lines.add(table, row, "ln_evidence", fit.evidence.bridge.value, fit.evidence.bridge.error);
}

void add_hypothesis(Lines& lines, const HypothesisResult& one) {
    const char* table = "hypotheses";
    const Evidence& evidence = one.evidence;
    lines.add(table, one.name, "bridge", evidence.bridge.value, evidence.bridge.error);
    lines.add(
        table, one.name, "savage_dickey", one.savage_dickey.value, one.savage_dickey.error);
    lines.add(
        table, one.name, "importance", evidence.importance.value, evidence.importance.error);
    for (const PriorWidth& width : one.prior_width)
        lines.add(table,
                  one.name,
                  fmt::format("{}_prior_times_{:.3g}", width.vector, width.factor),
                  width.log_evidence.value,
                  width.log_evidence.error);
}

void add_check(Lines& lines, const FitCheck& check) {
    const std::string row = check.survey + "/" + check.bin;
    lines.add("fit", row, "dispersion", check.dispersion, check.dispersion_sd);
    lines.add("fit", row, "p", check.probability);
    for (const ResidualPower& power : check.power)
        lines.add("fit", row, fmt::format("p_l{}", power.multipole), power.probability);
}

}  // namespace

std::string to_csv(const Comparison& all) {
    Lines lines;
    for (const SurveyFit& fit : all.alone) add_fit(lines, fit.name, fit);
    for (const SurveyFit& fit : all.without) add_fit(lines, "without " + fit.name, fit);
    add_fit(lines, "joint", all.joint);
    for (const HypothesisResult& one : all.hypotheses) add_hypothesis(lines, one);
    for (const IntrinsicAtReference& one : all.intrinsic)
        lines.add("intrinsic", one.name, "amplitude", one.amplitude.median, one.amplitude.sd);
    for (const SurveyPair& pair : all.pairs) {
        const std::string row = pair.first + " - " + pair.second;
        lines.add("pairs", row, "chi2", pair.difference.chi2);
        lines.add("pairs", row, "sigma", pair.difference.sigma);
    }
    lines.add("consistency", "all", "chi2", all.consistency.chi2);
    lines.add("consistency", "all", "degrees", all.consistency.degrees);
    lines.add("consistency", "all", "sigma", all.consistency.sigma);
    for (const FitCheck& check : all.fit) add_check(lines, check);
    for (const SurveyOverlap& one : all.overlap)
        lines.add("overlap",
                  one.first + " - " + one.second,
                  "matches",
                  one.matches ? static_cast<double>(*one.matches) : VelocityOffset::undefined,
                  VelocityOffset::undefined);
    return lines.text();
}

}  // namespace deviascope
