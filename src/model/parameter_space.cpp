// SPDX-License-Identifier: GPL-2.0-or-later
#include "deviascope/model/parameter_space.h"

#include <fmt/format.h>

#include <Eigen/Cholesky>
#include <algorithm>
#include <boost/math/special_functions/gamma.hpp>
#include <cmath>
#include <limits>
#include <numbers>

namespace deviascope {
namespace {

constexpr double not_drawn_yet = std::numeric_limits<double>::quiet_NaN();

/// A component that the prior holds at one value whatever the coordinates.
bool is_constant(const VectorPrior& prior, Eigen::Index component) {
    if (const auto* along = std::get_if<AxisPrior>(&prior.kind()))
        return along->axis[component] == 0.0;
    return std::holds_alternative<FixedPrior>(prior.kind());
}

/// |L (x - mean)|^2 for a lower triangular L, term by term: the matrix library's sums depend on
/// where in memory x begins.
double squared_length(const Eigen::MatrixXd& lower,
                      const Eigen::Ref<const Eigen::VectorXd>& x,
                      const Eigen::VectorXd& mean) {
    double sum = 0.0;
    for (Eigen::Index row = 0; row < mean.size(); ++row) {
        double component = 0.0;
        for (Eigen::Index column = 0; column <= row; ++column)
            component += lower(row, column) * (x[column] - mean[column]);
        sum += component * component;
    }
    return sum;
}

const char* direction_of_component(Eigen::Index component) {
    constexpr const char* towards[] = {
        "longitude 0, latitude 0", "longitude 90 deg, latitude 0", "latitude 90 deg"};
    return towards[component];
}

}  // namespace

ParameterSpace::ParameterSpace(const Counts& counts, const ModelOptions& options)
    : options_(options) {
    const std::vector<Message> problems = problems_of(options, counts);
    if (!problems.empty()) throw UsageError(problems);
    add_vectors(counts);
    add_weights(counts);
    add_monopoles(counts);
    add_terms(counts);
}

void ParameterSpace::add_vector(VectorParameter vector,
                                const std::string& meaning,
                                const std::string& unit,
                                const VectorPrior& prior) {
    vector.first = n_parameters();
    vector.amplitude_free = !std::holds_alternative<FixedPrior>(prior.kind());
    vector.direction_free = prior.n_coordinates() == 3;
    for (Eigen::Index c = 0; c < 3; ++c)
        parameters_.push_back(
            {fmt::format("{}.{}", vector.name, "xyz"[c]),
             unit,
             fmt::format("{}, component towards {}", meaning, direction_of_component(c)),
             is_constant(prior, c) ? Role::constant : Role::sampled});
    vector_places_.push_back({vector.first, n_coordinates_, 1.0});
    n_coordinates_ += prior.n_coordinates();
    vectors_.push_back(std::move(vector));
}

void ParameterSpace::add_vectors(const Counts& counts) {
    const std::string frame = name_of(counts.frame);
    add_vector({"velocity"},
               fmt::format("observer's velocity in units of c, {} frame", frame),
               "c",
               options_.velocity);
    const std::string dipole = "intrinsic dipole of {}, " + frame + " frame";
    if (options_.intrinsic_shared) {
        add_vector({"intrinsic.all"},
                   fmt::format(fmt::runtime(dipole), "all surveys"),
                   "1",
                   options_.intrinsic);
        return;
    }
    for (std::size_t s = 0; s < counts.surveys.size(); ++s) {
        const std::string& name = counts.surveys[s].name;
        add_vector({"intrinsic." + name},
                   fmt::format(fmt::runtime(dipole), "survey " + name),
                   "1",
                   options_.surveys[s].intrinsic);
    }
}

void ParameterSpace::add_weights(const Counts& counts) {
    for (std::size_t s = 0; s < counts.surveys.size(); ++s) {
        const WeightPrior& prior = options_.surveys[s].weights;
        WeightPlace place;
        place.parameter = n_parameters();
        place.coordinate = n_coordinates_;
        place.sampled = prior.sampled();
        for (const BinCounts& bin : counts.surveys[s].bins)
            parameters_.push_back(
                {fmt::format("weight.{}.{}", counts.surveys[s].name, bin.name),
                 "1",
                 fmt::format("kinematic weight of bin {} of survey {}",
                             bin.name,
                             counts.surveys[s].name),
                 Role::constant});
        for (const Eigen::Index bin : place.sampled)
            parameters_[static_cast<std::size_t>(place.parameter + bin)].role = Role::sampled;
        const auto n = std::ssize(place.sampled);
        place.mean = prior.mean(place.sampled);
        const Eigen::MatrixXd factor =
            Eigen::MatrixXd(prior.covariance(place.sampled, place.sampled)).llt().matrixL();
        place.precision_factor =
            factor.triangularView<Eigen::Lower>().solve(Eigen::MatrixXd::Identity(n, n));
        place.log_normalisation =
            -0.5 * static_cast<double>(n) * std::log(2.0 * std::numbers::pi) -
            factor.diagonal().array().log().sum();
        n_coordinates_ += n;
        weight_places_.push_back(std::move(place));
    }
}

void ParameterSpace::add_monopoles(const Counts& counts) {
    monopole_parameter_ = n_parameters();
    monopole_coordinate_ = n_coordinates_;
    const Role role = options_.monopole.sampled ? Role::sampled : Role::redrawn;
    for (const SurveyCounts& survey : counts.surveys)
        for (const BinCounts& bin : survey.bins)
            parameters_.push_back(
                {fmt::format("monopole.{}.{}", survey.name, bin.name),
                 "1/sr",
                 fmt::format("sources per steradian at full exposure of bin {} of survey {}, "
                             "in the frame of the sources",
                             bin.name,
                             survey.name),
                 role});
    if (options_.monopole.sampled) n_coordinates_ += n_parameters() - monopole_parameter_;
}

void ParameterSpace::add_terms(const Counts& counts) {
    Eigen::Index monopole = monopole_parameter_;
    for (std::size_t s = 0; s < counts.surveys.size(); ++s) {
        VectorPlace& intrinsic = vector_places_[options_.intrinsic_shared ? 1 : s + 1];
        for (std::size_t b = 0; b < counts.surveys[s].bins.size(); ++b) {
            const BinModel& bin = options_.surveys[s].bins[b];
            BinTerm term;
            term.survey = s;
            term.bin = b;
            term.intrinsic = intrinsic.parameter;
            term.weight = weight_places_[s].parameter + static_cast<Eigen::Index>(b);
            term.monopole = monopole++;
            term.bias_ratio = bin.bias_ratio;
            term.dispersion = bin.dispersion;
            intrinsic.largest_ratio =
                std::max(intrinsic.largest_ratio, std::abs(bin.bias_ratio));
            terms_.push_back(term);
        }
    }
}

const VectorPrior& ParameterSpace::vector_prior(std::size_t v) const {
    if (v == 0) return options_.velocity;
    return options_.intrinsic_shared ? options_.intrinsic
                                     : options_.surveys.at(v - 1).intrinsic;
}

void ParameterSpace::to_parameters(const Eigen::Ref<const Eigen::VectorXd>& coordinates,
                                   Eigen::Ref<Eigen::VectorXd> parameters) const {
    for (std::size_t v = 0; v < vectors_.size(); ++v) {
        const VectorPrior& prior = vector_prior(v);
        const VectorPlace& place = vector_places_[v];
        parameters.segment<3>(place.parameter) =
            prior.vector_at(coordinates.segment(place.coordinate, prior.n_coordinates()));
    }
    for (std::size_t s = 0; s < weight_places_.size(); ++s) {
        const WeightPlace& place = weight_places_[s];
        const Eigen::VectorXd& mean = options_.surveys[s].weights.mean;
        parameters.segment(place.parameter, mean.size()) = mean;
        for (Eigen::Index k = 0; k < std::ssize(place.sampled); ++k)
            parameters[place.parameter + place.sampled[static_cast<std::size_t>(k)]] =
                coordinates[place.coordinate + k];
    }
    // One at a time: the matrix library's exp depends on where in memory the row begins.
    for (Eigen::Index m = monopole_parameter_; m < n_parameters(); ++m)
        parameters[m] =
            options_.monopole.sampled
                ? std::exp(coordinates[monopole_coordinate_ + m - monopole_parameter_])
                : not_drawn_yet;
}

Eigen::VectorXd ParameterSpace::to_coordinates(
    const Eigen::Ref<const Eigen::VectorXd>& parameters) const {
    Eigen::VectorXd coordinates(n_coordinates_);
    for (std::size_t v = 0; v < vectors_.size(); ++v) {
        const VectorPrior& prior = vector_prior(v);
        const VectorPlace& place = vector_places_[v];
        coordinates.segment(place.coordinate, prior.n_coordinates()) =
            prior.coordinates_of(parameters.segment<3>(place.parameter));
    }
    for (const WeightPlace& place : weight_places_)
        for (Eigen::Index k = 0; k < std::ssize(place.sampled); ++k)
            coordinates[place.coordinate + k] =
                parameters[place.parameter + place.sampled[static_cast<std::size_t>(k)]];
    if (options_.monopole.sampled)
        for (Eigen::Index m = monopole_parameter_; m < n_parameters(); ++m)
            coordinates[monopole_coordinate_ + m - monopole_parameter_] =
                std::log(parameters[m]);
    return coordinates;
}

bool ParameterSpace::is_inside_walls(
    const Eigen::Ref<const Eigen::VectorXd>& parameters) const {
    return std::all_of(
        vector_places_.begin(), vector_places_.end(), [&](const VectorPlace& place) {
            const Eigen::Vector3d vector = parameters.segment<3>(place.parameter);
            return (place.largest_ratio * vector).squaredNorm() < 1.0;
        });
}

double ParameterSpace::log_monopole_prior(
    const Eigen::Ref<const Eigen::VectorXd>& coordinates) const {
    const MonopolePrior& prior = options_.monopole;
    if (!prior.sampled) return 0.0;
    double sum = 0.0;
    for (const double log_monopole : coordinates.tail(n_coordinates_ - monopole_coordinate_)) {
        if (prior.shape > 0.0) sum += prior.shape * log_monopole;
        if (prior.rate > 0.0) sum -= prior.rate * std::exp(log_monopole);
        if (!prior.is_improper())
            sum += prior.shape * std::log(prior.rate) - boost::math::lgamma(prior.shape);
    }
    return sum;
}

double ParameterSpace::log_prior(const Eigen::Ref<const Eigen::VectorXd>& coordinates) const {
    double sum = log_monopole_prior(coordinates);
    for (std::size_t v = 0; v < vectors_.size(); ++v) {
        const VectorPrior& prior = vector_prior(v);
        sum += prior.log_density(
            coordinates.segment(vector_places_[v].coordinate, prior.n_coordinates()));
    }
    for (const WeightPlace& place : weight_places_)
        sum += place.log_normalisation -
               0.5 * squared_length(place.precision_factor,
                                    coordinates.segment(place.coordinate, place.mean.size()),
                                    place.mean);
    return sum;
}

}  // namespace deviascope
