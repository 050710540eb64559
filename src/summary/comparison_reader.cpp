// SPDX-License-Identifier: GPL-2.0-or-later
#include "deviascope/core/error.h"
#include "deviascope/core/physical_constants.h"
#include "deviascope/summary/comparison.h"
#include "summary/json_parts.h"

namespace deviascope {
namespace {

constexpr double undefined = VelocityOffset::undefined;

double number_in(const Json& json) {
    return json.is_null() ? undefined : json.get<double>();
}

Interval interval_in(const Json& json, double unit) {
    if (json.is_null()) return {undefined, undefined};
    return {number_in(json.at(0)) / unit, number_in(json.at(1)) / unit};
}

ScalarEstimate scalar_in(const Json& json, double unit) {
    return {number_in(json.at("median")) / unit,
            number_in(json.at("mean")) / unit,
            number_in(json.at("sd")) / unit,
            interval_in(json.at("interval68"), unit),
            interval_in(json.at("interval95"), unit)};
}

Eigen::Vector3d vector_in(const Json& json) {
    return {number_in(json.at(0)), number_in(json.at(1)), number_in(json.at(2))};
}

VelocityGaussian gaussian_in(const Json& json) {
    VelocityGaussian gaussian{vector_in(json.at("mean")), {}};
    for (int row = 0; row < 3; ++row)
        gaussian.covariance.row(row) = vector_in(json.at("covariance").at(std::size_t(row)));
    return gaussian;
}

HypothesisResult hypothesis_in(const Json& json) {
    HypothesisResult one;
    one.name = json.at("name").get<std::string>();
    one.velocity = json.at("velocity").get<std::string>();
    one.intrinsic = json.at("intrinsic").get<std::string>();
    const Json& evidence = json.at("ln_evidence");
    one.evidence.bridge = {number_in(evidence.at("bridge")), number_in(evidence.at("error"))};
    for (const Json& width : json.at("prior_width"))
        one.prior_width.push_back(
            {width.at("vector").get<std::string>(),
             number_in(width.at("factor")),
             {number_in(width.at("ln_evidence")), number_in(width.at("error"))}});
    one.converged = json.at("converged").get<bool>();
    return one;
}

SurveyFit fit_in(const Json& json, const std::string& name) {
    SurveyFit fit;
    fit.name = name;
    fit.velocity = gaussian_in(json.at("vector"));
    fit.speed = scalar_in(json.at("speed_km_s"), speed_of_light_km_s);
    fit.offset.chi2 = number_in(json.at("offset").at("chi2"));
    fit.offset.sigma = number_in(json.at("offset").at("sigma"));
    fit.converged = json.at("converged").get<bool>();
    return fit;
}

std::vector<SurveyFit> fits_in(const Json& json, const char* role) {
    std::vector<SurveyFit> fits;
    for (const Json& one : json) fits.push_back(fit_in(one, one.at(role).get<std::string>()));
    return fits;
}

Comparison comparison_in(const Json& json) {
    Comparison all;
    all.fingerprint = json.at("fingerprint").get<std::string>();
    all.job = json.at("job").get<std::string>();
    all.reference = json.at("reference").at("name").get<std::string>();
    all.reference_velocity = vector_in(json.at("reference").at("velocity"));
    const auto frame = frame_of_name(json.at("frame").get<std::string>());
    if (frame) all.frame = *frame;
    for (const Json& one : json.at("hypotheses")) all.hypotheses.push_back(hypothesis_in(one));
    const Json& surveys = json.at("surveys");
    all.alone = fits_in(surveys.at("alone"), "survey");
    all.without = fits_in(surveys.at("leave-one-out"), "without");
    all.joint = fit_in(surveys.at("joint"), "joint");
    const Json& together = surveys.at("consistency");
    all.consistency.n_surveys = together.at("surveys").get<std::size_t>();
    all.consistency.chi2 = number_in(together.at("chi2"));
    all.consistency.degrees = number_in(together.at("degrees"));
    all.consistency.probability = number_in(together.at("p"));
    all.consistency.sigma = number_in(together.at("sigma"));
    all.warnings = json.at("warnings").get<std::vector<std::string>>();
    return all;
}

}  // namespace

Comparison comparison_of_json(const std::string& text, const std::string& place) {
    try {
        const Json json = Json::parse(text);
        const Json schema = json.value("schema", Json());
        if (schema != 1)
            throw InputError({place, "schema " + schema.dump(), "schema 1 is allowed", ""});
        return comparison_in(json);
    } catch (const Json::exception& fault) {
        throw InputError({place,
                          std::string("not what compare writes: ") + fault.what(),
                          "",
                          "make it again with deviascope compare --replace"});
    }
}

}  // namespace deviascope
