// SPDX-License-Identifier: GPL-2.0-or-later
#include "job/prior_reader.h"

#include <fmt/format.h>

#include <functional>
#include <utility>
#include <vector>

#include "deviascope/core/physical_constants.h"
#include "deviascope/job/job.h"
#include "job/covariance_rule.h"
#include "job/frame_reader.h"

namespace deviascope {

namespace {

using MaybeKind = std::optional<VectorPrior::Kind>;

/// Longest amplitude a prior may allow: velocities are below that of light, dipoles below 1.
std::optional<double> read_max(const TomlTable& table) {
    return table.number("max", above_up_to(0, 1), required);
}

MaybeKind read_uniform_vector(const TomlTable& table, Frame) {
    const auto max = read_max(table);
    return max ? MaybeKind(UniformVectorPrior{*max}) : std::nullopt;
}

MaybeKind read_uniform_amplitude(const TomlTable& table, Frame) {
    const auto max = read_max(table);
    return max ? MaybeKind(UniformAmplitudePrior{*max}) : std::nullopt;
}

/// Three components of a vector that is shorter than 1.
std::optional<Eigen::Vector3d> read_short_vector(const TomlTable& table,
                                                 const std::string& key) {
    const auto value = table.numbers(key, 3, {}, required);
    if (!value) return std::nullopt;
    if (value->norm() < 1.0) return Eigen::Vector3d(*value);
    table.wrong(key, "a vector shorter than 1");
    return std::nullopt;
}

MaybeKind read_isotropic_gaussian(const TomlTable& table) {
    const auto sd = table.number("sd", above(0));
    table.refuse("mean", "given besides sd, which stands for mean 0", "leave one of them out");
    table.refuse("covariance", "given besides sd", "leave one of them out");
    if (!sd) return std::nullopt;
    return GaussianPrior{Eigen::Vector3d::Zero(), *sd * *sd * Eigen::Matrix3d::Identity()};
}

MaybeKind read_gaussian(const TomlTable& table, Frame) {
    if (table.has("sd")) return read_isotropic_gaussian(table);
    if (!table.has("mean") && !table.has("covariance")) {
        table.fault("sd", "missing", "sd, or mean and covariance, is required");
        return std::nullopt;
    }
    const auto mean = read_short_vector(table, "mean");
    const auto covariance = read_covariance(table, "covariance", 3, required);
    if (!mean || !covariance) return std::nullopt;
    return GaussianPrior{*mean, *covariance};
}

MaybeKind read_measured_velocity(const TomlTable& table, Frame job_frame) {
    const NumberRange speeds = inside(0, speed_of_light_km_s);
    const auto speed = table.number("speed_km_s", speeds, required);
    const auto speed_sd = table.number("speed_sd_km_s", speeds, required);
    const auto lon = table.number("lon_deg", between(-360, 360), required);
    const auto lon_sd = table.number("lon_sd_deg", above_up_to(0, 180), required);
    const auto lat = table.number("lat_deg", inside(-90, 90), required);
    const auto lat_sd = table.number("lat_sd_deg", above_up_to(0, 90), required);
    const auto frame = read_frame(table, "frame", required);
    if (!speed || !speed_sd || !lon || !lon_sd || !lat || !lat_sd || !frame) return {};
    return gaussian_of({*speed, *speed_sd, *lon, *lon_sd, *lat, *lat_sd, *frame}, job_frame);
}

MaybeKind read_axis(const TomlTable& table, Frame job_frame) {
    const auto lon = table.number("lon_deg", between(-360, 360), required);
    const auto lat = table.number("lat_deg", between(-90, 90), required);
    const auto frame = read_frame(table, "frame", required);
    const auto max = read_max(table);
    if (!lon || !lat || !frame || !max) return std::nullopt;
    return AxisPrior{rotation(*frame, job_frame) * direction_of(*lon, *lat), *max};
}

MaybeKind read_fixed(const TomlTable& table, Frame) {
    const auto value = read_short_vector(table, "value");
    return value ? MaybeKind(FixedPrior{*value}) : std::nullopt;
}

using KindReader = MaybeKind (*)(const TomlTable&, Frame);
const std::vector<std::pair<std::string, KindReader>>& kind_readers() {
    static const std::vector<std::pair<std::string, KindReader>> readers = {
        {"uniform-vector", read_uniform_vector},
        {"uniform-amplitude", read_uniform_amplitude},
        {"gaussian", read_gaussian},
        {"measured-velocity", read_measured_velocity},
        {"axis", read_axis},
        {"fixed", read_fixed}};
    return readers;
}

template <class Value>
std::vector<std::string> names_of(const std::vector<std::pair<std::string, Value>>& pairs) {
    std::vector<std::string> names;
    for (const auto& [name, value] : pairs) names.push_back(name);
    return names;
}

/// The `kind` of a prior; where it is faulty the other keys cannot be judged.
std::optional<std::size_t> read_kind(const TomlTable& table,
                                     const std::vector<std::string>& kinds) {
    const auto kind = table.choice("kind", kinds, required);
    if (!kind) table.ignore_unknown_keys();
    return kind;
}

void read_monopole_prior(const TomlTable& table, MonopolePrior& prior) {
    const auto kind = read_kind(table, {"gamma", "log-uniform", "uniform"});
    if (!kind) return;
    const bool gamma = *kind == 0;
    prior.shape = *kind == 2 ? 1.0 : 0.0;
    prior.rate = 0.0;
    if (!gamma) return;
    prior.shape = table.number("shape", above(0), required).value_or(0.0);
    prior.rate = table.number("rate", above(0), required).value_or(0.0);
}

}  // namespace

std::optional<VectorPrior> read_vector_prior(const TomlTable& table,
                                             const std::string& name,
                                             Frame job_frame) {
    const auto kind = read_kind(table, names_of(kind_readers()));
    if (!kind) return std::nullopt;
    table.text("source");
    const auto& [kind_name, read] = kind_readers()[*kind];
    const MaybeKind prior = read(table, job_frame);
    if (!prior) return std::nullopt;
    return VectorPrior(name.empty() ? kind_name : name, *prior);
}

MonopolePrior read_monopole(const TomlTable& table) {
    MonopolePrior prior;
    if (table.has("prior")) read_monopole_prior(table.table("prior"), prior);
    prior.sampled = table.boolean("sample").value_or(false);
    return prior;
}

VectorPrior parse_prior(const Companion& companion, Frame job_frame) {
    TomlDocument document(companion.text, companion.path);
    const auto prior = read_vector_prior(document.root(), companion.name, job_frame);
    document.finish();
    ensure(prior.has_value(), "a prior file without faults gives a prior");
    return *prior;
}

}  // namespace deviascope
