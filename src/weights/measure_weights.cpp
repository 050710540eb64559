// SPDX-License-Identifier: GPL-2.0-or-later
#include "deviascope/weights/measure_weights.h"

#include <fmt/format.h>
#include <fmt/ranges.h>

#include <algorithm>
#include <array>
#include <cmath>
#include <limits>
#include <utility>

#include "deviascope/core/error.h"
#include "deviascope/core/grouped_number.h"
#include "deviascope/core/parallel.h"
#include "weights/scatter_free.h"
#include "weights/sky_experiment.h"
#include "weights/source_stream.h"
#include "weights/weights_from_tally.h"

namespace deviascope {

namespace {

constexpr std::int64_t fewest_sources =
    1000;                          // in a bin: its weight is then known to about 0.3
constexpr double widest_sd = 1.0;  // of a weight that is worth its name
constexpr double unstable = 3.0;   // standard deviations
constexpr double suspicious_pull = 3.0;

/// Standard deviation, with n - 1; NaN of fewer than two values.
double sd_of(const std::vector<double>& values) {
    const Eigen::Map<const Eigen::ArrayXd> all(values.data(), std::ssize(values));
    if (all.size() < 2) return std::numeric_limits<double>::quiet_NaN();
    return std::sqrt((all - all.mean()).square().sum() / double(all.size() - 1));
}

/// Everything between the catalogue and the report of one survey.
class Measurement {
  public:
    Measurement(const SurveyInput& survey,
                const SourcePhysics& physics,
                const std::vector<std::size_t>& bins,
                const Pixelisation& grid,
                Frame frame,
                const WeighOptions& options)
        : survey_(survey),
          options_(options),
          boxes_(survey, bins),
          sources_(survey, physics, boxes_, grid, frame, options_),
          tally_(boxes_,
                 {options.seed,
                  options.survey,
                  std::max(options.replicates, 4 * static_cast<int>(bins.size())),
                  options.threads,
                  sources_.index_varies(),
                  sources_.weights_vary()}),
          scatter_(
              boxes_, physics, options_, sources_.index_varies(), sources_.weights_vary()) {
        if (options.experiment_speed > 0.0)
            experiment_.emplace(boxes_, options_, sources_.one_plus_alpha());
    }

    MeasuredWeights measure() {
        sources_.read([this](const SourceBatch& batch) {
            tally_.add(batch);
            if (experiment_) experiment_->add(batch);
            if (scatter_.has_scatter()) scatter_.add(batch);
        });
        refuse_missing_index();
        refuse_small_bins();
        const WeightEstimator estimator(boxes_, tally_, sources_.one_plus_alpha());
        refuse_empty_edges(estimator);
        find_replicates(estimator);
        const auto chosen = estimator.weights(0, WindowWidth::chosen);
        const auto half = estimator.weights(0, WindowWidth::half);
        const auto twice = estimator.weights(0, WindowWidth::twice);
        for (std::size_t b = 0; b < boxes_.box.size(); ++b)
            report_bin(estimator, b, {chosen[b], half[b], twice[b]});
        refuse_unconstrained();
        if (scatter_.has_scatter()) report_scatter(estimator);
        warn_of_sources(estimator);
        out_.survey = survey_.name;
        out_.experiment_speed = options_.experiment_speed;
        return std::move(out_);
    }

  private:
    std::string place(std::size_t box) const {
        return fmt::format("survey {}, bin {}", survey_.name, name(box));
    }
    const std::string& name(std::size_t box) const {
        return survey_.bins[boxes_.box[box].bin].name;
    }
    std::string describe(const Edge& edge) const {
        const BoxSide& side = boxes_.box[edge.box].sides[edge.side];
        return fmt::format("{} {}", boxes_.dimension[side.dimension].property, edge.value);
    }

    void refuse_missing_index() const {
        const std::int64_t n = tally_.sources_without_index();
        if (n == 0) return;
        std::vector<std::string> places;
        for (const std::int64_t source : tally_.first_without_index())
            places.push_back(sources_.place_of(source));
        throw InputError({"survey " + survey_.name,
                          fmt::format("{} no spectral index alpha at the edges of bins: {}{}",
                                      n == 1 ? "1 source has" : grouped(n) + " sources have",
                                      fmt::join(places, ", "),
                                      n > std::ssize(places) ? ", …" : ""),
                          "a number for each source near an edge of flux or magnitude",
                          "give the survey alpha = { mean = …, sd = … } for those without"});
    }

    void refuse_small_bins() const {
        for (std::size_t b = 0; b < boxes_.box.size(); ++b) {
            if (tally_.sources_in_box(b) >= fewest_sources) continue;
            throw InputError({place(b),
                              fmt::format("{} sources, too few to measure its weight from",
                                          grouped(tally_.sources_in_box(b))),
                              fmt::format("at least {} are needed", grouped(fewest_sources)),
                              "give the bin its weight, or make it wider"});
        }
    }

    void refuse_empty_edges(const WeightEstimator& estimator) const {
        for (std::size_t e = 0; e < boxes_.edge.size(); ++e) {
            if (!estimator.plan(e).too_few) continue;
            const Edge& edge = boxes_.edge[e];
            throw InputError(
                {place(edge.box),
                 fmt::format("next to no sources near its edge {}", describe(edge)),
                 "an edge has sources near it, on one side at least",
                 fmt::format("write {} where the bin is open, or correct the edge",
                             edge.upper ? "inf" : "-inf")});
        }
    }

    /// Weights of all replicates, and their covariance. A replicate in which a fit fails is
    /// left out; that happens only where hardly any sources are.
    void find_replicates(const WeightEstimator& estimator) {
        const auto n_boxes = static_cast<Eigen::Index>(boxes_.box.size());
        const auto n = static_cast<Eigen::Index>(tally_.n_replicates());
        replicate_.resize(n, n_boxes);
        half_.resize(n, n_boxes);
        parallel_for(tally_.n_replicates(), options_.threads, [&](std::size_t r) {
            const auto chosen = estimator.weights(r + 1, WindowWidth::chosen);
            const auto half = estimator.weights(r + 1, WindowWidth::half);
            for (std::size_t b = 0; b < boxes_.box.size(); ++b) {
                const auto row = static_cast<Eigen::Index>(r);
                const auto column = static_cast<Eigen::Index>(b);
                replicate_(row, column) = chosen[b];
                half_(row, column) = half[b];
            }
        });
        Eigen::Index kept = 0;
        Eigen::MatrixXd sound(n, n_boxes);
        for (Eigen::Index r = 0; r < n; ++r)
            if (replicate_.row(r).allFinite()) sound.row(kept++) = replicate_.row(r);
        if (kept < n * 9 / 10)
            throw InputError({"survey " + survey_.name,
                              fmt::format("in {} of {} bootstrap replicates a weight is "
                                          "undetermined",
                                          n - kept,
                                          n),
                              "enough sources near every edge",
                              "give weights to the small bins, or make them wider"});
        const Eigen::MatrixXd centred =
            sound.topRows(kept).rowwise() - sound.topRows(kept).colwise().mean();
        out_.covariance.resize(n_boxes, n_boxes);
        for (Eigen::Index i = 0; i < n_boxes; ++i)
            for (Eigen::Index j = 0; j <= i; ++j)
                out_.covariance(i, j) = out_.covariance(j, i) =
                    centred.col(i).dot(centred.col(j)) / static_cast<double>(kept - 1);
        out_.replicates = static_cast<int>(kept);
    }

    /// @param weight  with the chosen windows, half and twice as wide ones
    void report_bin(const WeightEstimator& estimator,
                    std::size_t b,
                    const std::array<double, 3>& weight) {
        const auto column = static_cast<Eigen::Index>(b);
        BinReport bin;
        bin.name = name(b);
        bin.mean = weight[0];
        bin.sd = std::sqrt(out_.covariance(column, column));
        bin.sources = tally_.sources_in_box(b);
        bin.with_half_windows = weight[1];
        bin.with_twice_windows = weight[2];
        for (std::size_t e = 0; e < boxes_.edge.size(); ++e)
            if (boxes_.edge[e].box == b) bin.edges.push_back(report_edge(estimator, e));
        if (experiment_) bin.experiment = experiment_->result(b, estimator, tally_, bin.sd);
        warn_of_instability(bin, column);
        out_.bins.push_back(std::move(bin));
    }

    EdgeReport report_edge(const WeightEstimator& estimator, std::size_t e) const {
        const Edge& edge = boxes_.edge[e];
        const EdgePlan& plan = estimator.plan(e);
        const EdgeCells& cells = tally_.cells(e);
        const BoxSide& side = boxes_.box[edge.box].sides[edge.side];
        const double below = cells.boundary(plan.window.below);
        const double above = cells.boundary(plan.window.above);
        EdgeReport report;
        report.property = boxes_.dimension[side.dimension].property;
        report.upper = edge.upper;
        report.value = edge.value;
        report.method = plan.method;
        report.sources = std::llround(plan.sources);
        report.inside = edge.inside_is_above() ? above : below;
        report.outside = edge.inside_is_above() ? below : above;
        report.unit = unit_of_coordinate(edge.kind);
        report.term = estimator.term(e, 0, WindowWidth::chosen);
        return report;
    }

    void warn(const std::string& bin, const std::string& text) {
        out_.warnings.push_back(fmt::format("bin {}: {}", bin, text));
    }

    /// The difference against half the windows has a noise of its own, known from the
    /// replicates.
    void warn_of_instability(const BinReport& bin, Eigen::Index column) {
        std::vector<double> differences;
        for (Eigen::Index r = 0; r < replicate_.rows(); ++r)
            if (const double d = half_(r, column) - replicate_(r, column); std::isfinite(d))
                differences.push_back(d);
        const double sd = differences.size() > 1 ? sd_of(differences) : 0.0;
        const double change = bin.with_half_windows - bin.mean;
        if (!std::isfinite(change) || std::abs(change) > unstable * sd)
            warn(bin.name,
                 fmt::format(
                     "its weight {:.4g} becomes {:.4g} with windows half as wide, {:.1f} "
                     "standard deviations of that difference; its distributions bend or "
                     "jump near an edge: the error is too small",
                     bin.mean,
                     bin.with_half_windows,
                     std::abs(change) / sd));
        if (bin.experiment && bin.experiment->possible &&
            std::abs(bin.experiment->pull()) > suspicious_pull)
            warn(
                bin.name,
                fmt::format("the full-sky experiment finds a dipole of {:.5f} where the weight "
                            "lets expect {:.5f}, {:.1f} standard deviations apart",
                            bin.experiment->dipole,
                            bin.experiment->expected,
                            std::abs(bin.experiment->pull())));
    }

    void refuse_unconstrained() const {
        for (const BinReport& bin : out_.bins) {
            if (bin.sd <= widest_sd) continue;
            throw InputError(
                {fmt::format("survey {}, bin {}", survey_.name, bin.name),
                 fmt::format("its weight is unconstrained: {:.2g} +- {:.2g}", bin.mean, bin.sd),
                 fmt::format("a standard deviation of {} or less", widest_sd),
                 "give the bin its weight, or make it wider"});
        }
    }

    void report_scatter(const WeightEstimator& estimator) {
        const Eigen::MatrixXd free = scatter_.weights(estimator, sources_.one_plus_alpha());
        for (std::size_t b = 0; b < boxes_.box.size(); ++b) {
            const double weight = free(0, static_cast<Eigen::Index>(b));
            if (std::isfinite(weight)) out_.bins[b].scatter_free = weight;
        }
        if (boxes_.box.size() < 2 || !free.row(0).allFinite()) return;
        ScatterShift shift = shift_in(estimator, free, 0);
        std::vector<double> with_free, without;
        for (Eigen::Index row = 1; row < free.rows(); ++row) {
            const ScatterShift other = shift_in(estimator, free, row);
            if (!std::isfinite(other.free_intrinsic)) continue;
            with_free.push_back(other.free_intrinsic);
            without.push_back(other.no_intrinsic);
        }
        shift.free_intrinsic_sd = sd_of(with_free);
        shift.no_intrinsic_sd = sd_of(without);
        out_.scatter_shift = shift;
    }

    /// The shift that a replicate tells (0: the catalogue).
    ScatterShift shift_in(const WeightEstimator& estimator,
                          const Eigen::MatrixXd& free,
                          Eigen::Index replicate) const {
        const auto r = static_cast<std::size_t>(replicate);
        std::vector<double> n, assumed;
        for (std::size_t b = 0; b < boxes_.box.size(); ++b) {
            n.push_back(tally_.in_box(b, r));
            assumed.push_back(free(replicate, static_cast<Eigen::Index>(b)));
        }
        return shift_of_velocity(n, estimator.weights(r, WindowWidth::chosen), assumed);
    }

    void warn_of_sources(const WeightEstimator& estimator) {
        for (std::size_t e = 0; e < boxes_.edge.size(); ++e) {
            const EdgePlan& plan = estimator.plan(e);
            const Edge& edge = boxes_.edge[e];
            if (plan.falls_off)
                warn(name(edge.box),
                     fmt::format("far fewer sources lie beyond its edge {} than inside it lets "
                                 "expect; the catalogue is taken to end there",
                                 describe(edge)));
            if (plan.unsettled)
                warn(name(edge.box),
                     fmt::format("the density of sources is not smooth near its edge {}; the "
                                 "narrowest window is used, and may still be biased",
                                 describe(edge)));
        }
        if (sources_.n_filled() > 0)
            out_.warnings.push_back(
                fmt::format("{} sources have no spectral index; the survey's mean and scatter "
                            "stand in",
                            grouped(sources_.n_filled())));
        warn_of_unnamed_limit();
    }

    /// The limit of a catalogue that no `select` names moves no source here, but does so on the
    /// sky.
    void warn_of_unnamed_limit() {
        const bool named = std::ranges::any_of(
            boxes_.edge, [](const Edge& edge) { return feels_spectral_index(edge.kind); });
        if (named) return;
        out_.warnings.emplace_back(
            "no select names a flux or magnitude: where the catalogue has such a limit, "
            "sources cross it too, and the weights lack x (1 + alpha), about 2; write the "
            "limit into the survey's select");
    }

    const SurveyInput& survey_;
    WeighOptions options_;
    Boxes boxes_;
    SourceStream sources_;
    CrossingTally tally_;
    ScatterFreeTally scatter_;
    std::optional<SkyExperimentTally> experiment_;
    Eigen::MatrixXd replicate_, half_;  // replicates x boxes
    MeasuredWeights out_;
};

}  // namespace

MeasuredWeights measure_weights(const SurveyInput& survey,
                                const SourcePhysics& physics,
                                const std::vector<std::size_t>& bins,
                                const Pixelisation& grid,
                                Frame frame,
                                const WeighOptions& options) {
    ensure(!bins.empty(), "there are bins to measure");
    return Measurement(survey, physics, bins, grid, frame, options).measure();
}

}  // namespace deviascope
