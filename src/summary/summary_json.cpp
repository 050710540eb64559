// SPDX-License-Identifier: GPL-2.0-or-later
#include <cmath>

#include "deviascope/core/physical_constants.h"
#include "deviascope/summary/summary.h"
#include "summary/json_parts.h"

namespace deviascope {
namespace {

Json vector_moments(const VectorSummary& vector) {
    Json mean, covariance;
    if (vector.amplitude_free) {
        mean = vector_of(vector.mean);
        covariance = matrix_of(vector.covariance);
    }
    return {{"mean", mean}, {"covariance", covariance}};
}

Json region(const std::optional<SkyRegion>& sky) {
    if (!sky) return {{"area_deg2", Json()}, {"radius_deg", Json()}};
    return {{"area_deg2", number(sky->area_deg2)}, {"radius_deg", or_null(sky->radius_deg)}};
}

Json direction(const VectorSummary& vector) {
    const bool is_free = vector.direction_free;
    return {{"galactic", lon_lat(is_free ? vector.galactic : std::nullopt)},
            {"icrs", lon_lat(is_free ? vector.icrs : std::nullopt)},
            {"region68", region(vector.region68)},
            {"region95", region(vector.region95)}};
}

Json vector(const VectorSummary& vector) {
    return {{"prior", vector.prior},
            {"prior_median_amplitude", number(vector.prior_median_amplitude)},
            {"amplitude", scalar(vector.amplitude)},
            {"vector", vector_moments(vector)},
            {"direction", direction(vector)}};
}

Json offset(const std::optional<CmbOffset>& found) {
    constexpr double undefined = std::numeric_limits<double>::quiet_NaN();
    const CmbOffset offset = found.value_or(
        CmbOffset{undefined, {undefined, undefined}, undefined, {undefined, undefined}});
    return {{"angle_deg",
             {{"median", number(offset.angle_median_deg)},
              {"interval68", interval(offset.angle68_deg)}}},
            {"speed_ratio",
             {{"median", number(offset.speed_ratio_median)},
              {"interval68", interval(offset.speed_ratio68)}}}};
}

Json velocity(const Summary& summary) {
    const VectorSummary& velocity = summary.velocity;
    return {{"prior", velocity.prior},
            {"prior_median_amplitude", number(velocity.prior_median_amplitude)},
            {"amplitude", scalar(velocity.amplitude)},
            {"speed_km_s", scalar(velocity.amplitude, speed_of_light_km_s)},
            {"vector", vector_moments(velocity)},
            {"direction", direction(velocity)},
            {"offset_from_cmb", offset(summary.offset_from_cmb)}};
}

Json bin(const BinSummary& bin) {
    const ScalarEstimate weight = unless_constant(bin.weight);
    return {{"survey", bin.survey},
            {"bin", bin.bin},
            {"sources", bin.sources},
            {"pixels", bin.pixels},
            {"sky_fraction", number(bin.sky_fraction)},
            {"monopole", median_and_interval(bin.monopole)},
            {"weight",
             {{"median", number(weight.median)},
              {"interval68", interval(weight.interval68)},
              {"prior_mean", number(bin.weight_prior_mean)},
              {"prior_sd", number(bin.weight_prior_sd)}}}};
}

Json weight_mode(const WeightMode& mode) {
    const bool is_free = mode.prior_sd > 0.0;
    return {{"mean", is_free ? number(mode.mean) : Json()},
            {"sd", is_free ? number(mode.sd) : Json()},
            {"prior_sd", is_free ? number(mode.prior_sd) : Json()}};
}

Json weight_modes(const Summary& summary) {
    Json json = Json::object();
    for (std::size_t survey = 0; survey < summary.weight_modes.size(); ++survey) {
        const WeightModes& modes = summary.weight_modes[survey];
        Json differential = weight_mode(modes.differential);
        const double false_dipole = modes.differential.sd * summary.velocity.amplitude.median;
        differential["false_dipole"] =
            modes.differential.prior_sd > 0.0 ? number(false_dipole) : Json();
        json[summary.survey_names[survey]] = {{"common", weight_mode(modes.common)},
                                              {"differential", differential}};
    }
    return json;
}

Json verdict(const SeparationEntry& entry) {
    return entry.velocity_prior_share ? Json(entry.verdict) : Json();
}

Json separation(const Summary& summary) {
    Json json = Json::object();
    for (std::size_t survey = 0; survey < summary.separation.surveys.size(); ++survey) {
        const SeparationEntry& entry = summary.separation.surveys[survey];
        json[summary.survey_names[survey]] = {
            {"weight_spread", or_null(entry.weight_spread)},
            {"velocity_prior_share", or_null(entry.velocity_prior_share)},
            {"verdict", verdict(entry)}};
    }
    const SeparationEntry& joint = summary.separation.joint;
    json["joint"] = {{"velocity_prior_share", or_null(joint.velocity_prior_share)},
                     {"verdict", verdict(joint)}};
    return json;
}

Json kernels(const KernelTally& tally) {
    Json json = Json::object();
    for (std::size_t kernel = 0; kernel < n_kernels; ++kernel)
        json[name_of(static_cast<Kernel>(kernel))] = {{"tried", tally.tried[kernel]},
                                                      {"taken", tally.taken[kernel]}};
    return json;
}

Json sampling(const SamplingSummary& sampling) {
    return {{"converged", sampling.converged},
            {"replicates", sampling.replicates},
            {"walkers", sampling.walkers},
            {"steps", sampling.outcome.steps},
            {"discarded", sampling.outcome.discarded},
            {"store_every", sampling.outcome.store_every},
            {"walker_rhat_max", number(sampling.walker_rhat_max)},
            {"replicate_rhat_max", number(sampling.replicate_rhat_max)},
            {"effective_draws_min", number(sampling.effective_draws_min)},
            {"autocorrelation_steps_max", number(sampling.autocorrelation_steps_max)},
            {"kernels", kernels(sampling.outcome.tally)},
            {"engine",
             {{"moment", sampling.moment_evaluations}, {"pixel", sampling.pixel_evaluations}}}};
}

}  // namespace

std::string to_json(const Summary& summary) {
    Json intrinsic = Json::object(), bins = Json::array();
    for (const VectorSummary& found : summary.intrinsic) intrinsic[found.name] = vector(found);
    for (const BinSummary& found : summary.bins) bins.push_back(bin(found));
    const Json json = {{"schema", 1},
                       {"job", summary.job},
                       {"frame", name_of(summary.frame)},
                       {"velocity", velocity(summary)},
                       {"intrinsic", intrinsic},
                       {"bins", bins},
                       {"weight_modes", weight_modes(summary)},
                       {"separation", separation(summary)},
                       {"sampling", sampling(summary.sampling)},
                       {"warnings", Json(summary.warnings)}};
    return page_of(json);
}

}  // namespace deviascope
