// SPDX-License-Identifier: GPL-2.0-or-later
// A chain whose draws were put there by hand, with all that figures are made from.
#pragma once

#include <algorithm>
#include <functional>
#include <memory>
#include <string>
#include <utility>
#include <vector>

#include "deviascope/chain/chain.h"
#include "deviascope/figures/figures.h"
#include "deviascope/summary/direction_densities.h"
#include "deviascope/summary/summary.h"
#include "even_counts.h"
#include "example_chain.h"

namespace deviascope::test {

/// A vector's prior and how its draws come about.
struct PosedVector {
    VectorPrior prior;
    std::function<Eigen::Vector3d(Stream&)> draw;
};

struct Pose {
    PosedVector velocity;
    std::vector<PosedVector> intrinsic;  ///< one a survey
    std::vector<std::string> surveys;    ///< names
    std::vector<std::string> bins = {"faint", "bright"};
    Eigen::Index n_rows = 40, n_walkers = 32;
    Frame frame = Frame::galactic;
};

/// Normal draws about a mean, the same width in each component.
inline std::function<Eigen::Vector3d(Stream&)> cloud(Eigen::Vector3d mean, double sd) {
    return [mean, sd](Stream& stream) {
        Eigen::Vector3d value = mean;
        for (Eigen::Index component = 0; component < 3; ++component)
            value[component] += sd * normal(stream);
        return value;
    };
}

class PosedPosterior {
  public:
    explicit PosedPosterior(const Pose& pose) {
        std::vector<even::Survey> surveys;
        for (const std::string& name : pose.surveys) {
            surveys.push_back({name, {}});
            for (const std::string& bin : pose.bins)
                surveys.back().bins.push_back(
                    {bin, 400, 3.0 + double(surveys.back().bins.size()), 0.05});
        }
        const VectorPrior none("no-intrinsic", FixedPrior{});
        ModelOptions model = even::make_model(surveys, pose.velocity.prior, none);
        for (std::size_t survey = 0; survey < surveys.size(); ++survey)
            model.surveys[survey].intrinsic = pose.intrinsic[survey].prior;
        chain_.counts = even::counts_of(8, surveys);
        chain_.counts.frame = pose.frame;
        space_ = std::make_unique<ParameterSpace>(chain_.counts, model);
        chain_.parameters = space_->parameters();
        chain_.vectors = space_->vectors();
        chain_.provenance = example_provenance();
        chain_.provenance.seed = 20260817;
        fill_draws(pose);
        chain_.outcome = {
            Outcome::End::converged, 100 + 4 * pose.n_rows, 100, 4, pose.n_rows, true, {}};
        chain_.warm_up.store_every = 4;
        chain_.warm_up.discarded = 100;
        SummaryOptions options;
        options.title = "Posed";
        options.seed = 20260817;
        options.cmb_velocity = cmb_velocity();
        summary_ = summarise(chain_, *space_, options);
        directions_ = direction_densities(chain_, summary_, 1);
    }

    /// 370 km/s towards (264, 48) deg, as rounded values of Planck 2018 I, Table 2.
    static Eigen::Vector3d cmb_velocity() { return 1.234e-3 * direction_of(264.0, 48.3); }

    const Chain& chain() const { return chain_; }
    const ParameterSpace& space() const { return *space_; }
    const Summary& summary() const { return summary_; }
    Summary& summary() { return summary_; }
    const std::vector<std::optional<DirectionDensity>>& directions() const {
        return directions_;
    }
    FigureSource source() const {
        return {chain_, *space_, summary_, directions_, cmb_velocity(), 20260817};
    }

  private:
    void fill_draws(const Pose& pose) {
        Draws& draws = chain_.draws;
        draws.n_rows = pose.n_rows;
        draws.n_replicates = 4;
        draws.n_walkers = pose.n_walkers;
        draws.n_parameters = space_->n_parameters();
        const Eigen::Index n = draws.n_rows * draws.n_replicates * draws.n_walkers;
        for (Eigen::Index draw = 0; draw < n; ++draw) {
            Stream stream(20260817, Purpose::test, 77, std::uint64_t(draw), 0);
            const std::size_t first = draws.value.size();
            draws.value.resize(first + std::size_t(draws.n_parameters));
            double* row = draws.value.data() + first;
            const auto put = [&](Eigen::Index at, const PosedVector& vector) {
                const Eigen::Vector3d value = vector.draw(stream);
                std::copy(value.data(), value.data() + 3, row + at);
            };
            put(0, pose.velocity);
            for (std::size_t survey = 0; survey < pose.intrinsic.size(); ++survey)
                put(3 + 3 * Eigen::Index(survey), pose.intrinsic[survey]);
            for (const BinTerm& term : space_->terms()) {
                const auto& weights = space_->options().surveys[term.survey].weights;
                row[term.weight] = weights.mean[Eigen::Index(term.bin)] + 0.05 * normal(stream);
                row[term.monopole] =
                    400.0 * 768.0 / 12.566370614359172 * (1.0 + 0.0018 * normal(stream));
            }
            draws.log_posterior.push_back(-1.0);
            draws.log_likelihood.push_back(-1.0);
        }
    }

    Chain chain_;
    std::unique_ptr<ParameterSpace> space_;
    Summary summary_;
    std::vector<std::optional<DirectionDensity>> directions_;
};

}  // namespace deviascope::test
