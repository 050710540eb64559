// SPDX-License-Identifier: GPL-2.0-or-later
#include "deviascope/model/vector_prior.h"

#include <fmt/format.h>

#include <Eigen/Cholesky>
#include <Eigen/Geometry>
#include <Eigen/LU>
#include <algorithm>
#include <boost/math/distributions/chi_squared.hpp>
#include <cmath>
#include <limits>
#include <numbers>
#include <vector>

#include "deviascope/core/error.h"
#include "deviascope/core/physical_constants.h"

namespace deviascope {
namespace {

constexpr double minus_infinity = -std::numeric_limits<double>::infinity();

template <typename... Cases>
struct Overloaded : Cases... {
    using Cases::operator()...;
};
template <typename... Cases>
Overloaded(Cases...) -> Overloaded<Cases...>;

// ---- what a kind allows ----

std::vector<Message> problems_of_max(const std::string& name, double max) {
    if (max > 0.0 && max <= 1.0) return {};
    return {{name, fmt::format("max = {}", max), "0 < max <= 1 is allowed", "choose another"}};
}

std::vector<Message> problems_of_length(const std::string& name,
                                        const char* what,
                                        const Eigen::Vector3d& vector) {
    if (vector.squaredNorm() < 1.0) return {};
    return {{name,
             fmt::format("{} = [{}, {}, {}]", what, vector.x(), vector.y(), vector.z()),
             "a vector shorter than 1 is allowed",
             "check its unit: velocities are in units of c"}};
}

std::vector<Message> problems_of(const std::string& name, const GaussianPrior& prior) {
    std::vector<Message> problems = problems_of_length(name, "mean", prior.mean);
    const Eigen::Matrix3d& c = prior.covariance;
    const double asymmetry = (c - c.transpose()).cwiseAbs().maxCoeff();
    const bool symmetric = asymmetry <= 1e-12 * c.cwiseAbs().maxCoeff();
    if (!c.allFinite() || !symmetric || c.llt().info() != Eigen::Success)
        problems.push_back(
            {name,
             fmt::format("covariance = [[{}, {}, {}], [{}, {}, {}], [{}, {}, {}]]",
                         c(0, 0),
                         c(0, 1),
                         c(0, 2),
                         c(1, 0),
                         c(1, 1),
                         c(1, 2),
                         c(2, 0),
                         c(2, 1),
                         c(2, 2)),
             "a symmetric positive definite matrix is allowed",
             "use kind = \"axis\" or \"fixed\" where a direction has no width"});
    return problems;
}

std::vector<Message> problems_of(const std::string& name, const AxisPrior& prior) {
    std::vector<Message> problems = problems_of_max(name, prior.max);
    if (std::abs(prior.axis.norm() - 1.0) > 1e-9 || !prior.axis.allFinite())
        problems.push_back({name,
                            fmt::format("an axis of length {}", prior.axis.norm()),
                            "a unit vector is allowed",
                            "divide it by its length"});
    return problems;
}

std::vector<Message> problems_of(const std::string& name, const VectorPrior::Kind& kind) {
    return std::visit(
        Overloaded{
            [&](const UniformVectorPrior& p) { return problems_of_max(name, p.max); },
            [&](const UniformAmplitudePrior& p) { return problems_of_max(name, p.max); },
            [&](const GaussianPrior& p) { return problems_of(name, p); },
            [&](const AxisPrior& p) { return problems_of(name, p); },
            [&](const FixedPrior& p) { return problems_of_length(name, "value", p.value); }},
        kind);
}

// ---- draws ----

Direction draw_direction(Stream& stream) {
    const double z = 2.0 * uniform(stream) - 1.0;
    const double lon = 2.0 * std::numbers::pi * uniform(stream);
    const double ring = std::sqrt((1.0 - z) * (1.0 + z));
    return {ring * std::cos(lon), ring * std::sin(lon), z};
}

Eigen::Vector3d draw_gaussian(const std::string& name,
                              const GaussianPrior& prior,
                              const Eigen::Matrix3d& factor,
                              Stream& stream) {
    constexpr int most_attempts = 1000000;
    for (int attempt = 0; attempt < most_attempts; ++attempt) {
        Eigen::Vector3d standard;
        for (double& component : standard) component = normal(stream);
        const Eigen::Vector3d vector = prior.mean + factor * standard;
        if (vector.squaredNorm() < 1.0) return vector;
    }
    throw NumericalError({"prior " + name,
                          fmt::format("none of {} draws is shorter than 1", most_attempts),
                          "vectors shorter than 1 are allowed",
                          "give it a smaller covariance"});
}

double median_of_draws(const VectorPrior& prior, std::uint64_t seed) {
    constexpr std::size_t n = 100000;
    std::vector<double> amplitude(n);
    for (std::size_t draw = 0; draw < n; ++draw) {
        Stream stream(seed, Purpose::prior_draw, 0, draw, 0);
        amplitude[draw] = prior.draw(stream).norm();
    }
    const auto middle = amplitude.begin() + n / 2;
    std::nth_element(amplitude.begin(), middle, amplitude.end());
    return 0.5 * (*middle + *std::max_element(amplitude.begin(), middle));
}

bool is_isotropic(const GaussianPrior& prior) {
    const Eigen::Matrix3d& c = prior.covariance;
    return prior.mean.isZero(0.0) &&
           c == Eigen::Matrix3d(c(0, 0) * Eigen::Matrix3d::Identity());
}

/// Median of Maxwell's distribution of scale sd, cut at 1: |v|^2 / sd^2 is chi-squared with
/// three degrees of freedom.
double median_of_isotropic(double sd) {
    const boost::math::chi_squared_distribution<double> chi_squared(3.0);
    const double inside = boost::math::cdf(chi_squared, 1.0 / (sd * sd));
    return sd * std::sqrt(boost::math::quantile(chi_squared, 0.5 * inside));
}

double log_ball_density(double max) {
    return -std::log(4.0 / 3.0 * std::numbers::pi) - 3.0 * std::log(max);
}

double log_density_in_ball(double max, const Eigen::Vector3d& coordinates) {
    return coordinates.norm() < max ? log_ball_density(max) : minus_infinity;
}

}  // namespace

GaussianPrior gaussian_of(const MeasuredVelocity& measured, Frame job_frame) {
    const double beta = measured.speed_km_s / speed_of_light_km_s;
    const double lon = measured.lon_deg * radians_per_degree;
    const double lat = measured.lat_deg * radians_per_degree;
    Eigen::Matrix3d axes;  // radial, along lon, along lat: columns
    axes.col(0) = direction_of(measured.lon_deg, measured.lat_deg);
    axes.col(1) = Eigen::Vector3d(-std::sin(lon), std::cos(lon), 0.0);
    axes.col(2) = axes.col(0).cross(axes.col(1));
    const Eigen::Vector3d sd(measured.speed_sd_km_s / speed_of_light_km_s,
                             beta * std::cos(lat) * measured.lon_sd_deg * radians_per_degree,
                             beta * measured.lat_sd_deg * radians_per_degree);
    const Eigen::Matrix3d turned = rotation(measured.frame, job_frame) * axes;
    const Eigen::Matrix3d scaled = turned * sd.asDiagonal();
    return {beta * turned.col(0), scaled * scaled.transpose()};
}

VectorPrior::VectorPrior(std::string name, Kind kind)
    : name_(std::move(name)), kind_(std::move(kind)) {
    const std::vector<Message> problems = problems_of("prior " + name_, kind_);
    if (!problems.empty()) throw UsageError(problems);
    if (const auto* gaussian = std::get_if<GaussianPrior>(&kind_)) {
        factor_ = gaussian->covariance.llt().matrixL();
        precision_factor_ = factor_.inverse();
        log_normalisation_ =
            -1.5 * std::log(2.0 * std::numbers::pi) - factor_.diagonal().array().log().sum();
    }
}

std::string VectorPrior::kind_name() const {
    constexpr const char* names[] = {
        "uniform-vector", "uniform-amplitude", "gaussian", "axis", "fixed"};
    static_assert(std::size(names) == std::variant_size_v<Kind>);
    return names[kind_.index()];
}

Eigen::Index VectorPrior::n_coordinates() const {
    if (std::holds_alternative<FixedPrior>(kind_)) return 0;
    return std::holds_alternative<AxisPrior>(kind_) ? 1 : 3;
}

Eigen::Vector3d VectorPrior::vector_at(
    const Eigen::Ref<const Eigen::VectorXd>& coordinates) const {
    if (const auto* fixed = std::get_if<FixedPrior>(&kind_)) return fixed->value;
    if (const auto* along = std::get_if<AxisPrior>(&kind_)) return coordinates[0] * along->axis;
    const Eigen::Vector3d u = coordinates;
    if (const auto* amplitude = std::get_if<UniformAmplitudePrior>(&kind_))
        return u * (u.squaredNorm() / (amplitude->max * amplitude->max));
    return u;
}

Eigen::VectorXd VectorPrior::coordinates_of(const Eigen::Vector3d& vector) const {
    if (std::holds_alternative<FixedPrior>(kind_)) return Eigen::VectorXd(0);
    if (const auto* along = std::get_if<AxisPrior>(&kind_))
        return Eigen::VectorXd::Constant(1, along->axis.dot(vector));
    const auto* amplitude = std::get_if<UniformAmplitudePrior>(&kind_);
    const double length = vector.norm();
    if (amplitude == nullptr || length == 0.0) return vector;
    return vector * std::cbrt((amplitude->max / length) * (amplitude->max / length));
}

Eigen::MatrixXd VectorPrior::jacobian_at(
    const Eigen::Ref<const Eigen::VectorXd>& coordinates) const {
    if (std::holds_alternative<FixedPrior>(kind_)) return Eigen::MatrixXd(3, 0);
    if (const auto* along = std::get_if<AxisPrior>(&kind_)) return along->axis;
    const auto* amplitude = std::get_if<UniformAmplitudePrior>(&kind_);
    if (amplitude == nullptr) return Eigen::Matrix3d::Identity();
    const Eigen::Vector3d u = coordinates;
    return (u.squaredNorm() * Eigen::Matrix3d::Identity() + 2.0 * u * u.transpose()) /
           (amplitude->max * amplitude->max);
}

double VectorPrior::log_density(const Eigen::Ref<const Eigen::VectorXd>& coordinates) const {
    if (!(vector_at(coordinates).squaredNorm() < 1.0)) return minus_infinity;
    return std::visit(Overloaded{[&](const UniformVectorPrior& p) {
                                     return log_density_in_ball(p.max, coordinates);
                                 },
                                 [&](const UniformAmplitudePrior& p) {
                                     return log_density_in_ball(p.max, coordinates);
                                 },
                                 [&](const GaussianPrior& p) {
                                     const Eigen::Vector3d standard =
                                         precision_factor_ * (coordinates - p.mean);
                                     return log_normalisation_ - 0.5 * standard.squaredNorm();
                                 },
                                 [&](const AxisPrior& p) {
                                     const bool inside =
                                         coordinates[0] >= 0.0 && coordinates[0] <= p.max;
                                     return inside ? -std::log(p.max) : minus_infinity;
                                 },
                                 [](const FixedPrior&) { return 0.0; }},
                      kind_);
}

Eigen::Vector3d VectorPrior::draw(Stream& stream) const {
    return std::visit(
        Overloaded{[&](const UniformVectorPrior& p) -> Eigen::Vector3d {
                       const Direction direction = draw_direction(stream);
                       return p.max * std::cbrt(uniform(stream)) * direction;
                   },
                   [&](const UniformAmplitudePrior& p) -> Eigen::Vector3d {
                       const Direction direction = draw_direction(stream);
                       return p.max * uniform(stream) * direction;
                   },
                   [&](const GaussianPrior& p) -> Eigen::Vector3d {
                       return draw_gaussian(name_, p, factor_, stream);
                   },
                   [&](const AxisPrior& p) -> Eigen::Vector3d {
                       return p.max * uniform(stream) * p.axis;
                   },
                   [](const FixedPrior& p) -> Eigen::Vector3d { return p.value; }},
        kind_);
}

double VectorPrior::furthest() const {
    return std::visit(Overloaded{[](const GaussianPrior&) { return 1.0; },
                                 [](const FixedPrior& p) { return p.value.norm(); },
                                 [](const auto& p) { return p.max; }},
                      kind_);
}

double VectorPrior::median_amplitude(std::uint64_t seed) const {
    return std::visit(
        Overloaded{[](const UniformVectorPrior& p) { return p.max / std::cbrt(2.0); },
                   [](const UniformAmplitudePrior& p) { return 0.5 * p.max; },
                   [&](const GaussianPrior& p) {
                       return is_isotropic(p)
                                  ? median_of_isotropic(std::sqrt(p.covariance(0, 0)))
                                  : median_of_draws(*this, seed);
                   },
                   [](const AxisPrior& p) { return 0.5 * p.max; },
                   [](const FixedPrior& p) { return p.value.norm(); }},
        kind_);
}

Eigen::Matrix3d VectorPrior::covariance() const {
    return std::visit(
        Overloaded{
            [](const UniformVectorPrior& p) -> Eigen::Matrix3d {
                return p.max * p.max / 5.0 * Eigen::Matrix3d::Identity();
            },
            [](const UniformAmplitudePrior& p) -> Eigen::Matrix3d {
                return p.max * p.max / 9.0 * Eigen::Matrix3d::Identity();
            },
            [](const GaussianPrior& p) -> Eigen::Matrix3d { return p.covariance; },
            [](const AxisPrior& p) -> Eigen::Matrix3d {
                return p.max * p.max / 12.0 * p.axis * p.axis.transpose();
            },
            [](const FixedPrior&) -> Eigen::Matrix3d { return Eigen::Matrix3d::Zero(); }},
        kind_);
}

}  // namespace deviascope
