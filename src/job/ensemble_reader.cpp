// SPDX-License-Identifier: GPL-2.0-or-later
#include "job/ensemble_reader.h"

#include <fmt/format.h>

#include <cmath>
#include <limits>
#include <utility>

namespace deviascope {

namespace {

constexpr std::int64_t most_steps = 1'000'000'000'000;

KernelFractions read_kernels(const TomlTable& table) {
    KernelFractions fractions;
    if (!table.has("kernels")) return fractions;
    const TomlTable kernels = table.table("kernels");
    const std::pair<const char*, double*> entries[] = {
        {"stretch", &fractions.stretch},
        {"differential-evolution", &fractions.differential_evolution},
        {"independence", &fractions.independence}};
    bool sound = static_cast<bool>(kernels);
    double sum = 0;
    for (const auto& [key, fraction] : entries) {
        const auto value = kernels.number(key, between(0, 1));
        sound = sound && (value || !kernels.has(key));
        *fraction = value.value_or(0.0);
        sum += *fraction;
    }
    if (sound && std::abs(sum - 1) > 1e-9) {
        kernels.fault_here(fmt::format("the fractions add to {:.10g}", sum),
                           "fractions that add to 1 are allowed",
                           "a kernel left out has fraction 0");
    }
    return fractions;
}

int read_walkers(const TomlTable& table, const std::optional<Eigen::Index>& n_coordinates) {
    const auto walkers = table.integer("walkers", 4, 1'000'000);
    if (!walkers) return 0;
    const std::int64_t least = 2 * n_coordinates.value_or(0) + 2;
    if (*walkers % 2 != 0 || *walkers < least) {
        const std::string reason =
            n_coordinates ? fmt::format(" of at least {} (twice the {} coordinates, plus 2)",
                                        least,
                                        *n_coordinates)
                          : "";
        table.wrong("walkers", "an even number" + reason);
    }
    return static_cast<int>(*walkers);
}

std::int64_t read_store_every(const TomlTable& table, std::int64_t max_steps) {
    const auto store_every = table.integer("store_every", 0, most_steps);
    if (!store_every) return 0;
    if (*store_every > max_steps)
        table.wrong("store_every", fmt::format("0, or at most max_steps ({})", max_steps));
    return *store_every;
}

}  // namespace

Eigen::Index n_coordinates_of(const ModelOptions& model) {
    Eigen::Index n = model.velocity.n_coordinates();
    if (model.intrinsic_shared) n += model.intrinsic.n_coordinates();
    for (const SurveyModel& survey : model.surveys) {
        if (!model.intrinsic_shared) n += survey.intrinsic.n_coordinates();
        n += (survey.weights.covariance.diagonal().array() > 0).count();
        if (model.monopole.sampled) n += std::ssize(survey.bins);
    }
    return n;
}

EngineOptions read_engine(const TomlTable& table) {
    EngineOptions options;
    // In the order of the enumeration.
    const auto engine = table.choice("engine", {"auto", "moment", "pixel"});
    if (engine) options.engine = static_cast<Engine>(*engine);
    options.tolerance = table.number("tolerance", above(0)).value_or(options.tolerance);
    return options;
}

EnsembleOptions read_ensemble(const TomlTable& table,
                              const std::optional<Eigen::Index>& n_coordinates) {
    EnsembleOptions options;
    options.replicates =
        static_cast<int>(table.integer("replicates", 1, 10'000).value_or(options.replicates));
    options.walkers = read_walkers(table, n_coordinates);
    options.effective_draws =
        table.number("effective_draws", at_least(1)).value_or(options.effective_draws);
    options.max_steps = table.integer("max_steps", 2, most_steps).value_or(options.max_steps);
    options.store_every = read_store_every(table, options.max_steps);
    options.kernels = read_kernels(table);
    return options;
}

}  // namespace deviascope
