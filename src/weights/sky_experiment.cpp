// SPDX-License-Identifier: GPL-2.0-or-later
#include "weights/sky_experiment.h"

#include <algorithm>
#include <cmath>
#include <functional>
#include <numbers>

#include "deviascope/core/parallel.h"
#include "deviascope/core/random.h"
#include "deviascope/sky/boost.h"

namespace deviascope {

namespace {

constexpr std::size_t rows_a_slice = 4096;

/// Simpson's rule with 64 steps.
double integral(const std::function<double(double)>& f, double from, double to) {
    constexpr int n = 64;
    const double h = (to - from) / n;
    double sum = f(from) + f(to);
    for (int i = 1; i < n; ++i) sum += (i % 2 == 1 ? 4.0 : 2.0) * f(from + h * i);
    return sum * h / 3.0;
}

/// A place that is isotropic on the sphere.
Direction random_direction(Stream& stream) {
    const double z = 2.0 * uniform(stream) - 1.0;
    const double azimuth = 2.0 * std::numbers::pi * uniform(stream);
    const double radius = std::sqrt((1.0 - z) * (1.0 + z));
    return {radius * std::cos(azimuth), radius * std::sin(azimuth), z};
}

/// D of a density 1 + D mu between a and b from its mean cosine; and its derivative.
struct DipoleOfMean {
    DipoleOfMean(double a, double b, double mean) {
        const double m1 = (b * b - a * a) / 2.0;
        const double m2 = (b * b * b - a * a * a) / 3.0;
        const double below = m2 - mean * m1;
        value = (mean * (b - a) - m1) / below;
        slope = ((b - a) * below + (mean * (b - a) - m1) * m1) / (below * below);
    }
    double value, slope;
};

}  // namespace

void SkyExperimentTally::Moments::add(double weight, double cosine) {
    n += weight;
    mu += weight * cosine;
    n_squared += weight * weight;
    mu_squared += weight * cosine * cosine;
}

void SkyExperimentTally::Moments::add(const Moments& other) {
    n += other.n;
    mu += other.mu;
    n_squared += other.n_squared;
    mu_squared += other.mu_squared;
}

SkyExperimentTally::SkyExperimentTally(const Boxes& boxes,
                                       const WeighOptions& options,
                                       double one_plus_alpha)
    : boxes_(boxes),
      options_(options),
      one_plus_alpha_(one_plus_alpha),
      beta_(options.experiment_speed),
      gamma_(1.0 / std::sqrt((1.0 - beta_) * (1.0 + beta_))),
      found_(boxes.box.size()) {}

void SkyExperimentTally::add(const SourceBatch& batch) {
    const std::size_t n_slices = (batch.kept.size() + rows_a_slice - 1) / rows_a_slice;
    std::vector<Found> found(n_slices, Found(boxes_.box.size()));
    parallel_for(n_slices, options_.threads, [&](std::size_t i) {
        const std::size_t end = std::min((i + 1) * rows_a_slice, batch.kept.size());
        for (std::size_t row = i * rows_a_slice; row < end; ++row)
            if (batch.kept[row] != 0) look_at_row(batch, row, found[i]);
    });
    for (const Found& slice : found)
        for (std::size_t box = 0; box < found_.size(); ++box)
            for (const Region region : {receding, approaching})
                found_[box][region].add(slice[box][region]);
}

double SkyExperimentTally::boosted(const SourceBatch& batch,
                                   std::size_t row,
                                   std::size_t dimension,
                                   double delta) const {
    const double value = batch.value[dimension][row];
    const double alpha =
        (batch.one_plus_alpha.empty() ? one_plus_alpha_ : batch.one_plus_alpha[row]) - 1.0;
    switch (boxes_.dimension[dimension].kind) {
        case Displaced::flux:
            return boosted_flux(value, alpha, delta);
        case Displaced::magnitude:
            return boosted_magnitude(value, alpha, delta);
        case Displaced::redshift:
            return boosted_redshift(value, delta);
        case Displaced::size:
            return boosted_size(value, delta);
        case Displaced::not_at_all:
            break;
    }
    return value;
}

void SkyExperimentTally::look_at_row(const SourceBatch& batch,
                                     std::size_t row,
                                     Found& found) const {
    Stream stream(options_.seed,
                  Purpose::sky_experiment,
                  static_cast<std::uint64_t>(batch.first_source) + row,
                  options_.survey,
                  0);
    const Direction at_rest = random_direction(stream);
    const Boost boost(Eigen::Vector3d(0.0, 0.0, beta_));
    const double delta = boost.doppler_factor(at_rest);
    const double cosine = boost.aberrated(at_rest).z();
    std::vector<double> value(boxes_.dimension.size());
    for (std::size_t d = 0; d < value.size(); ++d) value[d] = boosted(batch, row, d, delta);
    for (std::size_t b = 0; b < boxes_.box.size(); ++b) {
        const bool inside = std::ranges::all_of(boxes_.box[b].sides, [&](const BoxSide& side) {
            return value[side.dimension] >= side.low && value[side.dimension] < side.high;
        });
        const double weight = batch.weight.empty() ? 1.0 : batch.weight[b][row];
        if (inside) found[b][delta < 1.0 ? receding : approaching].add(weight, cosine);
    }
}

/// mu' at which delta = 1 / [gamma (1 - beta mu')] is 1.
double SkyExperimentTally::cosine_without_shift() const {
    return (1.0 - 1.0 / gamma_) / beta_;
}

std::array<double, 2> SkyExperimentTally::limits_of(Region region) const {
    return {region == approaching ? cosine_without_shift() : -1.0,
            region == receding ? cosine_without_shift() : 1.0};
}

/// Where no source is missed. `possible` is false where some would be in either half.
SkyExperimentTally::Region SkyExperimentTally::region_of(std::size_t box,
                                                         const WeightEstimator& estimator,
                                                         const CrossingTally& sums,
                                                         bool& possible) const {
    constexpr double margin = 1.5;  // for indices above the mean
    const double shift = std::log(gamma_ * (1.0 + beta_));
    bool misses_approaching = false, misses_receding = false;
    for (std::size_t e = 0; e < boxes_.edge.size(); ++e) {
        const Edge& edge = boxes_.edge[e];
        const EdgePlan& plan = estimator.plan(e);
        if (edge.box != box || plan.method == EdgeMethod::end_of_property) continue;
        const double speed = speed_of(edge.kind) * estimator.index_at_edge(e);
        const double outside = edge.upper ? sums.extent_above(e) : sums.extent_below(e);
        if (!plan.falls_off && outside > margin * std::abs(speed) * shift) continue;
        const bool enters_approaching = (speed > 0.0) != edge.upper;
        (enters_approaching ? misses_approaching : misses_receding) = true;
    }
    possible = !(misses_approaching && misses_receding);
    if (!misses_approaching && !misses_receding) return full_sky;
    return misses_approaching ? receding : approaching;
}

double SkyExperimentTally::share_moved_across(std::size_t edge,
                                              const WeightEstimator& estimator,
                                              double n,
                                              double log_delta) const {
    const auto& density = estimator.density(edge);
    if (!density) return 0.0;
    const double speed = speed_of(boxes_.edge[edge].kind) * estimator.index_at_edge(edge);
    const auto f = [&](double y) { return density->at(y); };
    return (boxes_.edge[edge].upper ? -1.0 : 1.0) * integral(f, -speed * log_delta, 0.0) / n;
}

double SkyExperimentTally::expected_count(std::size_t box,
                                          const WeightEstimator& estimator,
                                          double n,
                                          double cosine) const {
    const double delta = 1.0 / (gamma_ * (1.0 - beta_ * cosine));
    const double log_delta = std::log(delta);
    double product = delta * delta;
    for (std::size_t s = 0; s < boxes_.box[box].sides.size(); ++s) {
        double side = 1.0;
        for (const std::size_t edge : boxes_.edges_of_side[boxes_.first_side[box] + s])
            side += share_moved_across(edge, estimator, n, log_delta);
        product *= side;
    }
    return product;
}

double SkyExperimentTally::expected_mean(std::size_t box,
                                         const WeightEstimator& estimator,
                                         const CrossingTally& sums,
                                         Region region) const {
    const double n = sums.in_box(box, 0);
    const auto count = [&](double cosine) { return expected_count(box, estimator, n, cosine); };
    const auto [a, b] = limits_of(region);
    return integral([&](double mu) { return mu * count(mu); }, a, b) / integral(count, a, b);
}

SkyExperiment SkyExperimentTally::result(std::size_t box,
                                         const WeightEstimator& estimator,
                                         const CrossingTally& sums,
                                         double weight_sd) const {
    SkyExperiment out;
    const Region region = region_of(box, estimator, sums, out.possible);
    Moments found;
    for (const Region half : {receding, approaching})
        if (region == full_sky || region == half) found.add(found_[box][half]);
    out.possible = out.possible && found.n > 0.0;
    if (!out.possible) return out;
    const auto [a, b] = limits_of(region);
    const double mean = found.mu / found.n;
    const double variance =
        (found.mu_squared / found.n - mean * mean) * found.n_squared / (found.n * found.n);
    const DipoleOfMean dipole(a, b, mean);
    out.dipole = dipole.value;
    out.expected = DipoleOfMean(a, b, expected_mean(box, estimator, sums, region)).value;
    out.sd = std::hypot(dipole.slope * std::sqrt(variance), beta_ * weight_sd);
    return out;
}

}  // namespace deviascope
