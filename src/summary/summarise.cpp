// SPDX-License-Identifier: GPL-2.0-or-later
#include <fmt/format.h>

#include <algorithm>
#include <cmath>
#include <limits>
#include <numeric>

#include "deviascope/core/error.h"
#include "deviascope/core/parallel.h"
#include "deviascope/core/physical_constants.h"
#include "deviascope/summary/draw_values.h"
#include "deviascope/summary/summary.h"
#include "summary/cautions.h"
#include "summary/draw_moments.h"
#include "summary/weight_modes.h"

namespace deviascope {
namespace {

constexpr double undefined = std::numeric_limits<double>::quiet_NaN();

void check_rows(const Chain& chain, const ParameterSpace& space) {
    if (chain.draws.n_rows == 0)
        throw InputError(Message{chain.provenance.job_name,
                                 "the chain holds no stored draws",
                                 "a summary needs at least one row",
                                 "let the sampler run on"});
    ensure(chain.draws.n_parameters == space.n_parameters(),
           "the chain has the parameters of its job");
}

// ---- sampling ----

/// Largest (or smallest) defined value; NaN where there is none.
template <class Value, class Better>
double extreme(const std::vector<ScalarDiagnostics>& scalars, Value value, Better better) {
    double best = undefined;
    for (const ScalarDiagnostics& scalar : scalars) {
        const double found = value(scalar);
        if (!std::isnan(found) && (std::isnan(best) || better(found, best))) best = found;
    }
    return best;
}

/// Scalars that never change (a component of a vector along an axis) have nothing to converge.
bool is_defined(const ScalarDiagnostics& scalar) {
    return std::isfinite(scalar.walker_rhat) || std::isfinite(scalar.bulk);
}

SamplingSummary sampling_of(const Chain& chain,
                            const std::vector<MonitoredScalar>& monitored,
                            int threads) {
    SamplingSummary sampling;
    sampling.outcome = chain.outcome;
    sampling.converged = chain.outcome.end == Outcome::End::converged;
    sampling.replicates = chain.draws.n_replicates;
    sampling.walkers = chain.draws.n_walkers;
    sampling.n_draws = rows_of(chain.draws).rows();
    const auto diagnostics =
        diagnose(monitored, chain.draws, chain.outcome.store_every, threads);
    std::copy_if(diagnostics.begin(),
                 diagnostics.end(),
                 std::back_inserter(sampling.scalars),
                 is_defined);
    using S = ScalarDiagnostics;
    const auto& all = sampling.scalars;
    const auto larger = std::greater<double>();
    sampling.walker_rhat_max = extreme(
        all, [](const S& s) { return s.walker_rhat; }, larger);
    sampling.replicate_rhat_max = extreme(
        all, [](const S& s) { return s.replicate_rhat; }, larger);
    sampling.effective_draws_min = extreme(
        all, [](const S& s) { return s.effective_draws(); }, std::less<double>());
    sampling.autocorrelation_steps_max = extreme(
        all, [](const S& s) { return s.autocorrelation_steps; }, larger);
    for (const EvaluationCount& one : chain.state.evaluations) {
        if (one.way == "moment") sampling.moment_evaluations = one.times;
        if (one.way == "pixel") sampling.pixel_evaluations = one.times;
    }
    return sampling;
}

// ---- vectors ----

/// A prior's density in words and numbers.
struct PriorWords {
    std::string unit;  ///< ` c` for the velocity

    std::string operator()(const UniformVectorPrior& prior) const {
        return fmt::format("constant inside a ball of radius {:g}{}", prior.max, unit);
    }
    std::string operator()(const UniformAmplitudePrior& prior) const {
        return fmt::format(
            "uniform in amplitude up to {:g}{}, all directions alike", prior.max, unit);
    }
    std::string operator()(const GaussianPrior& prior) const {
        const std::string centre =
            prior.mean.isZero(0.0)
                ? "zero"
                : fmt::format("a vector of length {:.6g}{}", prior.mean.norm(), unit);
        return "Gaussian about " + centre + ", " + widths(prior.covariance);
    }
    std::string operator()(const AxisPrior& prior) const {
        return fmt::format(
            "along a fixed direction, uniform in amplitude up to {:g}{}", prior.max, unit);
    }
    std::string operator()(const FixedPrior& prior) const {
        return fmt::format("fixed at length {:g}{}", prior.value.norm(), unit);
    }

  private:
    std::string widths(const Eigen::Matrix3d& covariance) const {
        const Eigen::Vector3d sd = covariance.diagonal().cwiseSqrt();
        if (covariance.isApprox(sd[0] * sd[0] * Eigen::Matrix3d::Identity(), 1e-12))
            return fmt::format("sd {:.4g}{} a component", sd[0], unit);
        return fmt::format(
            "sd {:.4g}, {:.4g}, {:.4g}{} along x, y, z", sd[0], sd[1], sd[2], unit);
    }
};

void place(const Eigen::Vector3d& vector, Frame frame, VectorSummary& summary) {
    summary.galactic = lon_lat_of(rotation(frame, Frame::galactic) * vector);
    summary.icrs = lon_lat_of(rotation(frame, Frame::icrs) * vector);
}

SkyRegion region_of(const DirectionDensity& density,
                    const Directions& directions,
                    const MeanDirection& mean,
                    double probability) {
    SkyRegion region{density.area_deg2(probability), std::nullopt};
    if (mean.length >= least_mean_length)
        region.radius_deg =
            radius_about(directions.unit, mean.direction, probability) / radians_per_degree;
    return region;
}

/// Direction and regions of a vector whose direction is free.
void find_direction(const Directions& directions,
                    Frame frame,
                    double effective_draws,
                    VectorSummary& summary) {
    summary.draws_without_direction = directions.left_out;
    if (directions.unit.empty()) return;
    const MeanDirection mean = mean_direction(directions.unit);
    if (mean.length >= least_mean_length) place(mean.direction, frame, summary);
    const DirectionDensity density(directions.unit, effective_draws);
    summary.region68 = region_of(density, directions, mean, level68);
    summary.region95 = region_of(density, directions, mean, level95);
}

/// Its location and spread, and its limits where the draws do not tell it from zero.
void find_amplitude(std::vector<double> amplitude,
                    const VectorPrior& prior,
                    double effective_draws,
                    VectorSummary& summary) {
    summary.amplitude = estimate_of(amplitude);
    if (!summary.amplitude_free) return;
    const Support support{0.0, prior.furthest()};
    const LineDensity density = line_density(amplitude, effective_draws, support);
    summary.amplitude_limits = upper_limits_of(std::move(amplitude), density, support);
}

VectorSummary vector_of(const Chain& chain,
                        const ParameterSpace& space,
                        std::size_t index,
                        const std::vector<ScalarDiagnostics>& scalars,
                        std::uint64_t seed) {
    const DrawRows rows = rows_of(chain.draws);
    const VectorParameter& vector = space.vectors()[index];
    const VectorPrior& prior = space.vector_prior(index);
    const std::size_t dot = vector.name.find('.');
    VectorSummary summary;
    summary.name = dot == std::string::npos ? vector.name : vector.name.substr(dot + 1);
    summary.prior = prior.name();
    summary.prior_description = std::visit(PriorWords{index == 0 ? " c" : ""}, prior.kind());
    summary.prior_median_amplitude = prior.median_amplitude(seed);
    summary.amplitude_free = vector.amplitude_free;
    summary.direction_free = vector.direction_free;
    find_amplitude(amplitudes_of(rows, vector.first),
                   prior,
                   effective_values(vector.name + ".amplitude", scalars, chain.draws),
                   summary);
    const DrawMoments moments = moments_of(rows.middleCols<3>(vector.first).transpose());
    summary.mean = moments.mean;
    summary.covariance = moments.covariance;
    return summary;
}

std::optional<CmbOffset> offset_of(const DrawRows& rows,
                                   const VectorParameter& velocity,
                                   const Eigen::Vector3d& cmb_velocity) {
    ensure(!cmb_velocity.isZero(0.0), "the velocity of the CMB prior is not zero");
    std::vector<double> angle, ratio;
    for (Eigen::Index draw = 0; draw < rows.rows(); ++draw) {
        const Eigen::Vector3d beta = rows.block<1, 3>(draw, velocity.first).transpose();
        ratio.push_back(beta.norm() / cmb_velocity.norm());
        if (!beta.isZero(0.0))
            angle.push_back(separation(beta, cmb_velocity) / radians_per_degree);
    }
    if (angle.empty()) return std::nullopt;
    CmbOffset offset{undefined, {undefined, undefined}, undefined, {undefined, undefined}};
    if (velocity.direction_free) {
        const ScalarEstimate estimate = estimate_of(angle);
        offset.angle_median_deg = estimate.median;
        offset.angle68_deg = estimate.interval68;
    }
    if (velocity.amplitude_free) {
        const ScalarEstimate estimate = estimate_of(ratio);
        offset.speed_ratio_median = estimate.median;
        offset.speed_ratio68 = estimate.interval68;
    }
    return offset;
}

// ---- bins ----

std::vector<BinSummary> bins_of(const DrawRows& rows,
                                const Counts& counts,
                                const ParameterSpace& space) {
    const Pixelisation grid(counts.nside);
    std::vector<BinSummary> bins;
    for (const BinTerm& term : space.terms()) {
        const SurveyCounts& survey = counts.surveys[term.survey];
        const BinCounts& bin = survey.bins[term.bin];
        const Footprint& footprint = survey.footprints[bin.footprint];
        const WeightPrior& prior = space.options().surveys[term.survey].weights;
        const auto place = static_cast<Eigen::Index>(term.bin);
        bins.push_back({survey.name,
                        bin.name,
                        bin.total(),
                        std::ssize(footprint.pixel),
                        footprint.sky_fraction(grid),
                        estimate_of(column_of(rows, term.monopole)),
                        estimate_of(column_of(rows, term.weight)),
                        prior.mean[place],
                        std::sqrt(prior.covariance(place, place))});
    }
    return bins;
}

/// Modes of the weights of one survey.
WeightModes modes_of(const DrawRows& rows,
                     const Counts& counts,
                     const ParameterSpace& space,
                     std::size_t survey) {
    const WeightPrior& prior = space.options().surveys[survey].weights;
    Eigen::VectorXd n(prior.mean.size());
    Eigen::MatrixXd draws(rows.rows(), prior.mean.size());
    for (const BinTerm& term : space.terms()) {
        if (term.survey != survey) continue;
        const auto bin = static_cast<Eigen::Index>(term.bin);
        n[bin] = static_cast<double>(counts.surveys[survey].bins[term.bin].total());
        draws.col(bin) = rows.col(term.weight);
    }
    return weight_modes(n, prior, draws);
}

// ---- separation ----

Separation separation_from(const DrawRows& rows,
                           const Counts& counts,
                           const ParameterSpace& space,
                           const VectorSummary& velocity) {
    const Eigen::VectorXd mean = rows.colwise().mean().transpose();
    const Eigen::MatrixXd map = free_velocity_coordinates(space);
    return separation_of(counts, space, mean, map.transpose() * velocity.covariance * map);
}

}  // namespace

Summary summarise(const Chain& chain,
                  const ParameterSpace& space,
                  const SummaryOptions& options) {
    check_rows(chain, space);
    const DrawRows rows = rows_of(chain.draws);
    const auto monitored = monitored_scalars(space.parameters(), space.vectors());
    Summary summary;
    summary.job = options.title;
    summary.frame = chain.counts.frame;
    summary.sampling = sampling_of(chain, monitored, options.threads);

    std::vector<VectorSummary> vectors(space.vectors().size());
    parallel_for(vectors.size(), options.threads, [&](std::size_t index) {
        const VectorParameter& vector = space.vectors()[index];
        vectors[index] = vector_of(chain, space, index, summary.sampling.scalars, options.seed);
        if (vector.direction_free)
            find_direction(directions_of(rows, vector.first),
                           summary.frame,
                           effective_directions(vector, summary.sampling.scalars, chain.draws),
                           vectors[index]);
        else if (!vectors[index].mean.isZero(0.0))
            place(vectors[index].mean, summary.frame, vectors[index]);
    });
    summary.velocity = std::move(vectors.front());
    summary.intrinsic.assign(std::make_move_iterator(vectors.begin() + 1),
                             std::make_move_iterator(vectors.end()));
    summary.offset_from_cmb = offset_of(rows, space.vectors().front(), options.cmb_velocity);
    summary.bins = bins_of(rows, chain.counts, space);
    for (std::size_t survey = 0; survey < chain.counts.surveys.size(); ++survey)
        summary.weight_modes.push_back(modes_of(rows, chain.counts, space, survey));
    summary.separation = separation_from(rows, chain.counts, space, summary.velocity);
    for (const SurveyCounts& survey : chain.counts.surveys) {
        summary.cuts.push_back(survey.cuts);
        summary.survey_names.push_back(survey.name);
    }
    SummaryOptions carried = options;
    carried.job_warnings.insert(carried.job_warnings.end(),
                                chain.warm_up.warnings.begin(),
                                chain.warm_up.warnings.end());
    summary.warnings = cautions_of(summary, space, carried);
    return summary;
}

}  // namespace deviascope
