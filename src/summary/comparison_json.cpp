// SPDX-License-Identifier: GPL-2.0-or-later
#include <array>

#include "deviascope/core/physical_constants.h"
#include "deviascope/summary/comparison.h"
#include "summary/json_parts.h"

namespace deviascope {
namespace {

Json offset(const VelocityOffset& found) {
    return {{"vector", vector_of(found.difference)},
            {"chi2", number(found.chi2)},
            {"p", number(found.probability)},
            {"sigma", number(found.sigma)},
            {"angle_deg", median_and_interval(found.angle_deg)},
            {"speed_ratio", median_and_interval(found.speed_ratio)},
            {"from_draws",
             {{"p", number(found.shift_probability)},
              {"sigma", number(found.shift_sigma)},
              {"is_limit", found.shift_is_limit}}}};
}

Json hypothesis(const HypothesisResult& one, const HypothesisResult& best) {
    Json widths = Json::array();
    for (const PriorWidth& width : one.prior_width)
        widths.push_back({{"vector", width.vector},
                          {"factor", number(width.factor)},
                          {"ln_evidence", number(width.log_evidence.value)},
                          {"error", number(width.log_evidence.error)}});
    const double apart = best.evidence.bridge.value - one.evidence.bridge.value;
    return {{"name", one.name},
            {"velocity", one.velocity},
            {"intrinsic", one.intrinsic},
            {"ln_evidence",
             {{"bridge", number(one.evidence.bridge.value)},
              {"error", number(one.evidence.bridge.error)},
              {"savage_dickey", number(one.savage_dickey.value)},
              {"savage_dickey_error", number(one.savage_dickey.error)},
              {"importance", number(one.evidence.importance.value)},
              {"importance_error", number(one.evidence.importance.error)}}},
            {"ln_bayes_factor", number(-apart)},
            {"evidence_against", &one == &best ? Json() : Json(grade_of(apart))},
            {"nested_in", one.nested_in.empty() ? Json() : Json(one.nested_in)},
            {"prior_width", widths},
            {"converged", one.converged}};
}

Json intrinsic(const IntrinsicAtReference& one) {
    return {{"name", one.name},
            {"prior", one.prior},
            {"prior_median_amplitude", number(one.prior_median_amplitude)},
            {"amplitude", scalar(one.amplitude)},
            {"clustering_p", or_null(one.clustering_probability)}};
}

Json fit_of(const SurveyFit& one, const char* role) {
    Json json = Json::object();
    if (role != nullptr) json[role] = one.name;
    json["vector"] = {{"mean", vector_of(one.velocity.mean)},
                      {"covariance", matrix_of(one.velocity.covariance)}};
    json["speed_km_s"] = scalar(one.speed, speed_of_light_km_s);
    json["offset"] = offset(one.offset);
    json["ln_evidence"] = number(one.evidence.bridge.value);
    json["error"] = number(one.evidence.bridge.error);
    json["converged"] = one.converged;
    return json;
}

Json fits_of(const std::vector<SurveyFit>& fits, const char* role) {
    Json json = Json::array();
    for (const SurveyFit& one : fits) json.push_back(fit_of(one, role));
    return json;
}

Json surveys(const Comparison& all) {
    Json pairs = Json::array();
    for (const SurveyPair& pair : all.pairs)
        pairs.push_back({{"surveys", Json::array({pair.first, pair.second})},
                         {"chi2", number(pair.difference.chi2)},
                         {"p", number(pair.difference.probability)},
                         {"sigma", number(pair.difference.sigma)}});
    const Consistency& together = all.consistency;
    return {
        {"alone", fits_of(all.alone, "survey")},
        {"leave-one-out", fits_of(all.without, "without")},
        {"joint", fit_of(all.joint, nullptr)},
        {"pairs", pairs},
        {"consistency",
         {{"surveys", together.n_surveys},
          {"chi2", number(together.chi2)},
          {"degrees", number(together.degrees)},
          {"p", number(together.probability)},
          {"sigma", number(together.sigma)},
          {"ln_suspiciousness", number(together.ln_suspiciousness)},
          {"ln_suspiciousness_from_evidence", number(all.ln_suspiciousness_from_evidence)}}}};
}

Json residual(const ResidualPixel& pixel, Frame frame) {
    return {{"pixel", pixel.pixel},
            {"galactic", lon_lat(lon_lat_of(rotation(frame, Frame::galactic) * pixel.centre))},
            {"icrs", lon_lat(lon_lat_of(rotation(frame, Frame::icrs) * pixel.centre))},
            {"count", pixel.count},
            {"expected", number(pixel.expected)},
            {"sigma", number(pixel.sigma)}};
}

Json check(const FitCheck& one, Frame frame) {
    Json largest = Json::array(), multipoles = Json::array();
    for (const ResidualPixel& pixel : one.largest) largest.push_back(residual(pixel, frame));
    for (const ResidualPower& power : one.power)
        multipoles.push_back({{"l", power.multipole},
                              {"chi2", number(power.chi2)},
                              {"p", number(power.probability)}});
    return {{"survey", one.survey},
            {"bin", one.bin},
            {"dispersion", number(one.dispersion)},
            {"dispersion_sd", number(one.dispersion_sd)},
            {"assumed_dispersion", number(one.assumed_dispersion)},
            {"chi2", number(one.chi2)},
            {"degrees", number(one.degrees)},
            {"p", number(one.probability)},
            {"multipoles", multipoles},
            {"largest", largest}};
}

Json overlap(const SurveyOverlap& one) {
    return {{"surveys", Json::array({one.first, one.second})},
            {"shared_sky_fraction", number(one.shared_sky_fraction)},
            {"match_arcsec", number(one.match_arcsec)},
            {"matches", one.matches ? Json(*one.matches) : Json()},
            {"expected_by_chance", number(one.expected_by_chance)}};
}

}  // namespace

std::string to_json(const Comparison& all) {
    Json hypotheses = Json::array(), dipoles = Json::array(), checks = Json::array(),
         overlaps = Json::array();
    for (const HypothesisResult& one : all.hypotheses)
        hypotheses.push_back(hypothesis(one, all.hypotheses[best_hypothesis(all.hypotheses)]));
    for (const IntrinsicAtReference& one : all.intrinsic) dipoles.push_back(intrinsic(one));
    for (const FitCheck& one : all.fit) checks.push_back(check(one, all.frame));
    for (const SurveyOverlap& one : all.overlap) overlaps.push_back(overlap(one));
    return page_of(
        {{"schema", 1},
         {"job", all.job},
         {"fingerprint", all.fingerprint},
         {"frame", name_of(all.frame)},
         {"reference",
          {{"name", all.reference},
           {"velocity", vector_of(all.reference_velocity)},
           {"offset", offset(all.joint.offset)}}},
         {"hypotheses", hypotheses},
         {"clustering_prior", all.clustering.empty() ? Json() : Json(all.clustering)},
         {"intrinsic_at_reference", dipoles},
         {"surveys", surveys(all)},
         {"fit", checks},
         {"overlap", overlaps},
         {"warnings", Json(all.warnings)}});
}

}  // namespace deviascope
