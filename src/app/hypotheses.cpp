// SPDX-License-Identifier: GPL-2.0-or-later
#include "app/hypotheses.h"

#include <algorithm>
#include <utility>

namespace deviascope {

namespace {

/// A prior so many times as wide, where its width is a choice.
struct Widened {
    double factor;

    std::optional<VectorPrior::Kind> operator()(UniformVectorPrior prior) const {
        return limited(prior);
    }
    std::optional<VectorPrior::Kind> operator()(UniformAmplitudePrior prior) const {
        return limited(prior);
    }
    std::optional<VectorPrior::Kind> operator()(AxisPrior prior) const {
        return limited(std::move(prior));
    }
    std::optional<VectorPrior::Kind> operator()(GaussianPrior prior) const {
        if (!prior.mean.isZero(0.0)) return std::nullopt;
        prior.covariance *= factor * factor;
        return prior;
    }
    std::optional<VectorPrior::Kind> operator()(const FixedPrior&) const {
        return std::nullopt;
    }

  private:
    template <class Prior>
    std::optional<VectorPrior::Kind> limited(Prior prior) const {
        const double widest = std::min(1.0, factor * prior.max);
        if (widest == prior.max) return std::nullopt;
        prior.max = widest;
        return prior;
    }
};

std::optional<VectorPrior> widened(const VectorPrior& prior, double factor) {
    const auto kind = std::visit(Widened{factor}, prior.kind());
    if (!kind) return std::nullopt;
    return VectorPrior(prior.name(), *kind);
}

}  // namespace

ModelOptions with_velocity(ModelOptions model, const VectorPrior& velocity) {
    model.velocity = velocity;
    return model;
}

ModelOptions with_intrinsic(ModelOptions model, const VectorPrior& intrinsic, bool shared) {
    model.intrinsic_shared = shared;
    model.intrinsic = intrinsic;
    for (SurveyModel& survey : model.surveys) survey.intrinsic = intrinsic;
    return model;
}

std::vector<NamedModel> hypotheses_of(const Job& job, const VectorPrior& reference) {
    const ModelOptions& own = job.model;
    const ModelOptions alone =
        with_intrinsic(own, VectorPrior("no-intrinsic", FixedPrior{}), own.intrinsic_shared);
    std::vector<NamedModel> all{{"reference", with_velocity(alone, reference)},
                                {"reference-intrinsic", with_velocity(own, reference)},
                                {"free", alone},
                                {"free-intrinsic", own}};
    for (const Hypothesis& rival : job.hypotheses) {
        ModelOptions model = own;
        if (rival.velocity) model = with_velocity(std::move(model), *rival.velocity);
        if (rival.intrinsic)
            model = with_intrinsic(std::move(model), *rival.intrinsic, rival.intrinsic_shared);
        all.push_back({rival.name, std::move(model)});
    }
    return all;
}

std::optional<ModelOptions> with_velocity_width(const ModelOptions& model, double factor) {
    const auto prior = widened(model.velocity, factor);
    return prior ? std::optional(with_velocity(model, *prior)) : std::nullopt;
}

std::optional<ModelOptions> with_intrinsic_width(const ModelOptions& model, double factor) {
    ModelOptions changed = model;
    bool any = false;
    const auto widen = [&](VectorPrior& prior) {
        const auto wider = widened(prior, factor);
        if (!wider) return;
        prior = *wider;
        any = true;
    };
    if (model.intrinsic_shared) widen(changed.intrinsic);
    if (!model.intrinsic_shared)
        for (SurveyModel& survey : changed.surveys) widen(survey.intrinsic);
    return any ? std::optional(changed) : std::nullopt;
}

}  // namespace deviascope
