// SPDX-License-Identifier: GPL-2.0-or-later
#include "app/fit.h"

#include <fmt/format.h>

#include <algorithm>
#include <cmath>
#include <utility>

#include "app/interrupt.h"
#include "deviascope/core/random.h"
#include "deviascope/ensemble/diagnostics.h"
#include "deviascope/ensemble/memory_sink.h"

namespace deviascope {

Eigen::Matrix3Xd Fit::vector(std::size_t index) const {
    const Eigen::Index first = posterior->vectors()[index].first;
    Eigen::Matrix3Xd found(3, n_draws());
    for (Eigen::Index draw = 0; draw < n_draws(); ++draw)
        found.col(draw) = Eigen::Map<const Eigen::Vector3d>(draws.row_of(0, 0, draw) + first);
    return found;
}

ScalarEstimate Fit::amplitude(std::size_t index) const {
    std::vector<double> amplitude(static_cast<std::size_t>(n_draws()));
    Eigen::Map<Eigen::RowVectorXd>(amplitude.data(), n_draws()) =
        vector(index).colwise().norm();
    return estimate_of(std::move(amplitude));
}

Eigen::MatrixXd Fit::parameters() const {
    return Eigen::Map<const Eigen::MatrixXd>(draws.value.data(), draws.n_parameters, n_draws());
}

double Fit::effective_velocities() const {
    std::vector<MonitoredScalar> components;
    for (const MonitoredScalar& scalar :
         monitored_scalars(posterior->parameters(), posterior->vectors()))
        if (scalar.kind == MonitoredScalar::Kind::parameter && scalar.first < 3)
            components.push_back(scalar);
    double fewest = static_cast<double>(n_draws());
    for (const ScalarDiagnostics& found : diagnose(components, draws, outcome.store_every, 1))
        fewest = std::fmin(fewest, found.bulk);
    return fewest;
}

Fit Fitter::fit(std::string name,
                std::shared_ptr<const Counts> counts,
                const ModelOptions& model,
                double effective_draws) {
    Fit made;
    Stream stream(job_.seed, Purpose::comparison, 0, n_fits_++, 0);
    made.seed = stream() >> 1U;
    made.name = std::move(name);
    made.counts = std::move(counts);
    made.posterior = std::make_unique<Posterior>(*made.counts, model, made.seed);

    EnsembleOptions options = job_.ensemble;
    options.seed = made.seed;
    options.threads = options_.n_threads();
    options.walkers = 0;
    options.store_every = 0;
    options.effective_draws = std::min(options.effective_draws, effective_draws);
    options.stop_requested = interrupt_requested;
    const Progress show = terminal_.progress();
    options.progress = [&](const std::string& line) {
        if (show) show(fmt::format("{}: {}", made.name, line));
    };
    MemorySink sink;
    made.outcome = sample(*made.posterior, options, sink);
    if (made.outcome.end == Outcome::End::interrupted) throw Interrupted();
    for (const std::string& warning : sink.kept_warm_up.warnings)
        warnings_.push_back(fmt::format("{}: {}", made.name, warning));
    made.draws = std::move(sink.draws);
    made.coordinates = coordinate_draws(made.posterior->space(), made.draws);
    return made;
}

EvidenceOptions Fitter::evidence_options(const Fit& fit) const {
    return {.seed = fit.seed, .threads = options_.n_threads()};
}

Evidence Fitter::evidence(const Fit& fit) const {
    return evidence_of(*fit.posterior, fit.coordinates, evidence_options(fit));
}

std::shared_ptr<const Counts> counts_of(const Counts& counts,
                                        const std::vector<std::size_t>& surveys) {
    auto chosen = std::make_shared<Counts>();
    chosen->nside = counts.nside;
    chosen->frame = counts.frame;
    for (const std::size_t survey : surveys) chosen->surveys.push_back(counts.surveys[survey]);
    return chosen;
}

ModelOptions model_of(const ModelOptions& model, const std::vector<std::size_t>& surveys) {
    ModelOptions chosen = model;
    chosen.surveys.clear();
    for (const std::size_t survey : surveys) chosen.surveys.push_back(model.surveys[survey]);
    return chosen;
}

}  // namespace deviascope
