// SPDX-License-Identifier: GPL-2.0-or-later
#include <fmt/format.h>

#include <algorithm>
#include <cmath>
#include <set>
#include <utility>

#include "app/commands.h"
#include "app/fit.h"
#include "app/hypotheses.h"
#include "app/steps.h"
#include "app/weigh_step.h"
#include "deviascope/chain/fingerprint.h"
#include "deviascope/counts/sky_overlap.h"
#include "deviascope/sky/position_match.h"
#include "deviascope/summary/comparison.h"
#include "summary/draw_moments.h"

namespace deviascope {

namespace {

constexpr double width_draws = 2000;  // effective draws behind an evidence of another width
constexpr double width_factor = 3.0;

VelocityGaussian gaussian_velocity(const Fit& fit) {
    const DrawMoments moments = moments_of(fit.vector(0));
    return {moments.mean, moments.covariance};
}

/// The name of what a model says of the intrinsic dipoles.
std::string intrinsic_name(const ModelOptions& model) {
    if (model.intrinsic_shared) return model.intrinsic.name() + " (shared)";
    std::string names;
    std::set<std::string> said;
    for (const SurveyModel& survey : model.surveys)
        if (said.insert(survey.intrinsic.name()).second)
            names += (names.empty() ? "" : ", ") + survey.intrinsic.name();
    return names;
}

/// Makes the parts of a comparison, one after the other.
class Comparer {
  public:
    Comparer(const Job& job,
             const Counts& counts,
             const CommandOptions& options,
             Terminal& terminal)
        : job_(job),
          counts_(std::make_shared<Counts>(counts)),
          options_(options),
          terminal_(terminal),
          reference_(
              reference_velocity(options.reference, job.companions, job.folder, job.frame)),
          fitter_(job, options, terminal) {
        all_.job = job.title;
        all_.frame = job.frame;
        all_.reference = options.reference;
        all_.reference_velocity = reference_.mean;
        all_.clustering = options.clustering;
    }

    Comparison compare() {
        compare_hypotheses();
        compare_surveys();
        const DrawMoments joint = moments_of(joint_->parameters());
        all_.fit = check_fit(*counts_,
                             joint_->posterior->space(),
                             joint.mean,
                             joint.covariance,
                             options_.n_threads());
        find_overlaps();
        all_.warnings = job_.warnings;
        for (const auto& found : {fitter_.warnings(), cautions_of(all_)})
            all_.warnings.insert(all_.warnings.end(), found.begin(), found.end());
        return std::move(all_);
    }

  private:
    // ---- hypotheses ----

    void compare_hypotheses() {
        const auto models = hypotheses_of(job_, VectorPrior(options_.reference, reference_));
        std::vector<Fit> fits;
        for (const NamedModel& one : models) {
            fits.push_back(fitter_.fit(one.name, counts_, one.model));
            add_hypothesis(one, fits.back());
        }
        for (std::size_t i = 0; i < fits.size(); ++i) nest(fits, i);
        find_intrinsic_at_reference(fits[1], models[1].model);
        joint_.emplace(std::move(fits[3]));
        all_.joint = survey_fit("joint", *joint_, all_.hypotheses[3].evidence);
    }

    void add_hypothesis(const NamedModel& one, const Fit& fit) {
        HypothesisResult result;
        result.name = one.name;
        result.velocity = one.model.velocity.name();
        result.intrinsic = intrinsic_name(one.model);
        result.converged = fit.converged();
        result.evidence = fitter_.evidence(fit);
        for (const double factor : {1.0 / width_factor, width_factor}) {
            add_width(one, "velocity", factor, with_velocity_width(one.model, factor), result);
            add_width(
                one, "intrinsic", factor, with_intrinsic_width(one.model, factor), result);
        }
        terminal_.say(fmt::format("Hypothesis {}: ln evidence {:.2f} +- {:.2f}.",
                                  result.name,
                                  result.evidence.bridge.value,
                                  result.evidence.bridge.error));
        all_.hypotheses.push_back(std::move(result));
    }

    void add_width(const NamedModel& one,
                   const std::string& vector,
                   double factor,
                   const std::optional<ModelOptions>& model,
                   HypothesisResult& result) {
        if (!model) return;
        const Fit fit =
            fitter_.fit(one.name + ", other prior width", counts_, *model, width_draws);
        result.prior_width.push_back({vector, factor, fitter_.evidence(fit).bridge});
    }

    /// The evidence of a hypothesis by way of the one that is nearest around it.
    void nest(const std::vector<Fit>& fits, std::size_t inner) {
        HypothesisResult& result = all_.hypotheses[inner];
        std::size_t fewest = 0;
        for (std::size_t outer = 0; outer < fits.size(); ++outer) {
            if (outer == inner) continue;
            const Fit& wide = fits[outer];
            const auto points = tested_points(wide.posterior->space(),
                                              fits[inner].posterior->space(),
                                              wide.n_draws(),
                                              wide.seed);
            if (!points || (fewest > 0 && points->coordinate.size() >= fewest)) continue;
            const LogEvidence ratio = savage_dickey(
                *wide.posterior, wide.coordinates, *points, fitter_.evidence_options(wide));
            if (std::isnan(ratio.value)) continue;
            const LogEvidence& around = all_.hypotheses[outer].evidence.bridge;
            fewest = points->coordinate.size();
            result.nested_in = wide.name;
            result.savage_dickey = {around.value + ratio.value,
                                    std::hypot(around.error, ratio.error)};
        }
    }

    // ---- the intrinsic dipole, if the velocity is the reference's ----

    void find_intrinsic_at_reference(const Fit& fit, const ModelOptions& model) {
        for (std::size_t v = 1; v < fit.posterior->vectors().size(); ++v) add_intrinsic(fit, v);
        if (model.intrinsic_shared || model.surveys.size() < 2) return;
        const Fit shared = fitter_.fit("one intrinsic dipole at the reference velocity",
                                       counts_,
                                       with_intrinsic(model, model.intrinsic, true));
        add_intrinsic(shared, 1);
    }

    void add_intrinsic(const Fit& fit, std::size_t v) {
        const std::string& name = fit.posterior->vectors()[v].name;
        const VectorPrior& prior = fit.posterior->space().vector_prior(v);
        IntrinsicAtReference found;
        found.name = name.substr(name.find('.') + 1);
        found.prior = prior.name();
        found.prior_median_amplitude = prior.median_amplitude(job_.seed);
        found.amplitude = fit.amplitude(v);
        if (!options_.clustering.empty())
            found.clustering_probability = chance_of_length(
                prior_of(options_.clustering, job_.companions, job_.folder, job_.frame),
                fit.vector(v),
                job_.seed);
        all_.intrinsic.push_back(std::move(found));
    }

    // ---- surveys ----

    SurveyFit survey_fit(const std::string& name, const Fit& fit, const Evidence& evidence) {
        SurveyFit made;
        made.name = name;
        made.velocity = gaussian_velocity(fit);
        made.speed = fit.amplitude(0);
        made.offset = offset_from(fit.vector(0),
                                  fit.effective_velocities(),
                                  reference_,
                                  fit.seed,
                                  options_.n_threads());
        made.evidence = evidence;
        made.converged = fit.converged();
        return made;
    }

    SurveyFit fit_surveys(const std::string& name, const std::vector<std::size_t>& surveys) {
        const Fit fit =
            fitter_.fit(name, counts_of(*counts_, surveys), model_of(job_.model, surveys));
        SurveyFit made = survey_fit(name, fit, fitter_.evidence(fit));
        terminal_.say(fmt::format("Fitted {}.", name));
        return made;
    }

    void compare_surveys() {
        const std::size_t n = counts_->surveys.size();
        if (n == 1) {
            all_.alone.push_back(all_.joint);
            all_.alone.front().name = counts_->surveys.front().name;
            return;
        }
        for (std::size_t s = 0; s < n; ++s) {
            all_.alone.push_back(fit_surveys(counts_->surveys[s].name + " alone", {s}));
            all_.alone.back().name = counts_->surveys[s].name;
        }
        for (std::size_t s = 0; s < n; ++s) all_.without.push_back(without(s));
        find_consistency();
    }

    SurveyFit without(std::size_t left_out) {
        std::vector<std::size_t> rest;
        for (std::size_t s = 0; s < counts_->surveys.size(); ++s)
            if (s != left_out) rest.push_back(s);
        const std::string& name = counts_->surveys[left_out].name;
        SurveyFit made = rest.size() == 1 ? all_.alone[rest.front()]
                                          : fit_surveys("all without " + name, rest);
        made.name = name;
        return made;
    }

    void find_consistency() {
        std::vector<std::optional<VelocityGaussian>> own;
        std::vector<VelocityGaussian> posteriors;
        std::vector<double> evidence;
        for (const SurveyFit& fit : all_.alone) {
            own.push_back(without_prior(fit.velocity, job_.model.velocity));
            posteriors.push_back(fit.velocity);
            evidence.push_back(fit.evidence.bridge.value);
        }
        for (std::size_t a = 0; a < own.size(); ++a)
            for (std::size_t b = a + 1; b < own.size(); ++b) {
                SurveyPair pair{all_.alone[a].name, all_.alone[b].name, {}};
                if (own[a] && own[b])
                    pair.difference = difference_of(own[a]->mean - own[b]->mean,
                                                    own[a]->covariance + own[b]->covariance);
                all_.pairs.push_back(pair);
            }
        all_.consistency = consistency_of(own);
        const bool all_hold = all_.consistency.n_surveys == own.size();
        if (all_hold && !job_.model.intrinsic_shared)
            all_.ln_suspiciousness_from_evidence =
                suspiciousness_from_evidence(posteriors,
                                             evidence,
                                             all_.joint.velocity,
                                             all_.joint.evidence.bridge.value,
                                             job_.model.velocity);
    }

    // ---- overlap ----

    void find_overlaps() {
        if (counts_->surveys.size() < 2) return;
        const double radius = job_.match_arcsec * radians_per_arcsec;
        const std::vector<std::optional<PositionIndex>> positions = indexed_positions(radius);
        for (std::size_t a = 0; a < counts_->surveys.size(); ++a)
            for (std::size_t b = a + 1; b < counts_->surveys.size(); ++b) {
                const SkyOverlap sky = sky_overlap(*counts_, a, b, radius);
                SurveyOverlap overlap{counts_->surveys[a].name,
                                      counts_->surveys[b].name,
                                      sky.shared_sky_fraction,
                                      job_.match_arcsec,
                                      std::nullopt,
                                      sky.expected_by_chance};
                if (positions[a] && positions[b])
                    overlap.matches = positions[a]->matches_of(*positions[b]);
                all_.overlap.push_back(overlap);
            }
    }

    /// Positions of the counted sources; empty for surveys that have count maps.
    std::vector<std::optional<PositionIndex>> indexed_positions(double radius) {
        KeptPositions kept;
        std::vector<std::optional<PositionIndex>> indices(job_.surveys.size());
        Terminal silent(true);
        count_surveys(job_, silent, &kept);
        for (std::size_t s = 0; s < kept.size(); ++s) {
            const bool has_maps =
                std::ranges::any_of(job_.surveys[s].bins,
                                    [](const BinInput& bin) { return bin.counts.has_value(); });
            if (!has_maps) indices[s].emplace(kept[s], radius);
            kept[s] = {};
        }
        return indices;
    }

    const Job& job_;
    std::shared_ptr<const Counts> counts_;
    const CommandOptions& options_;
    Terminal& terminal_;
    GaussianPrior reference_;
    Fitter fitter_;
    std::optional<Fit> joint_;
    Comparison all_;
};

}  // namespace

ExitCode compare_command(const CommandOptions& options) {
    Terminal terminal(options.quiet);
    const Job written = read_job(options.input);
    const std::filesystem::path folder = folder_of(options);
    prepare_output(
        folder, {"compare.json", "compare.txt", "compare.csv"}, existing_of(options));
    const InputRecord inputs = record_inputs(written, terminal);
    Job job = with_measured_weights(
        {written, inputs, options.n_threads()}, folder, existing_of(options), false, terminal);
    const CountsFile file = obtain_counts(job, inputs, folder, existing_of(options), terminal);
    measure_dispersions(job, file.counts, terminal);
    Comparison comparison = Comparer(job, file.counts, options, terminal).compare();
    comparison.fingerprint = fingerprint_of(provenance_of(job, inputs));
    write_text(folder / "compare.json", to_json(comparison));
    write_text(folder / "compare.csv", to_csv(comparison));
    const std::string text = to_text(comparison);
    write_text(folder / "compare.txt", text);
    terminal.say(text);
    terminal.say(fmt::format("Written: {}, and compare.json and compare.csv beside it.",
                             (folder / "compare.txt").string()));
    if (std::filesystem::exists(folder / "chains.h5"))
        terminal.say(fmt::format("To have it in the report: deviascope figures {} --replace",
                                 (folder / "chains.h5").string()));
    return options.strict && !comparison.warnings.empty() ? ExitCode::doubtful : ExitCode::done;
}

}  // namespace deviascope
