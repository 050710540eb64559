// SPDX-License-Identifier: GPL-2.0-or-later
// A small chain of invented surveys whose every number follows from its place, so that a
// program in another language can say what it must be.
#pragma once

#include <cmath>
#include <filesystem>
#include <limits>
#include <string>
#include <vector>

#include "deviascope/chain/chain_file.h"
#include "deviascope/counts/counts_file.h"

namespace deviascope::test {

/// Two surveys at nside 4: dunlin with two bins on one footprint (pixels 0, 3, 6, …, exposure
/// 1/(1 + place)), lantern with one bin on its second footprint.
inline Counts example_counts() {
    Counts counts;
    counts.nside = 4;
    counts.frame = Frame::ecliptic;
    Footprint thirds, last;
    for (std::int64_t pixel = 0; pixel < 192; pixel += 3) {
        thirds.pixel.push_back(pixel);
        thirds.exposure.push_back(1.0 / static_cast<double>(thirds.pixel.size()));
    }
    last.pixel = {190, 191};
    last.exposure = {1.0, 5e-324};
    std::vector<std::uint32_t> rising(thirds.pixel.size());
    for (std::size_t place = 0; place < rising.size(); ++place)
        rising[place] = static_cast<std::uint32_t>(place * place);
    const std::vector<std::uint32_t> none(thirds.pixel.size(), 0);
    SurveyCounts dunlin, lantern;
    dunlin.name = "dunlin";
    dunlin.footprints = {thirds};
    dunlin.bins = {{"faint", 0, rising}, {"bright", 0, none}};
    dunlin.cuts.rows_read = 100000;
    dunlin.cuts.rows_kept = 85344;
    dunlin.cuts.pixels_total = 192;
    dunlin.cuts.pixels_kept = 64;
    dunlin.cuts.cuts = {{"band = 15.0, galactic", 14000, 100}, {"flux: outside", 656, 28}};
    dunlin.cuts.warnings = {"the disc at (83.6°, 22.0°) removed nothing"};
    lantern.name = "lantern";
    lantern.footprints = {thirds, last};
    lantern.bins = {{"all", 1, {7, 4294967295U}}};
    counts.surveys = {lantern, dunlin};  // not in the order of their names
    return counts;
}

inline Provenance example_provenance() {
    Provenance job;
    job.job_name = "dunlin-lantern.toml";
    job.job_text = "[job]\ntitle = \"Dunlin and Lantern: β and D\"\nseed = 20260817\n";
    job.companions = {{"free-velocity", "/priors/free-velocity.toml", "max = 0.05\n"},
                      {"dunlin-weights.toml", "dunlin-weights.toml", ""}};
    job.inputs = {{"dunlin.fits", std::string(64, 'a'), 123456789012},
                  {"lantern.csv.gz", std::string(64, '0'), 0}};
    job.version = "0.1.0";
    job.libraries = "invented 1.0";
    job.seed = 20260817;
    job.started = "2026-08-17T10:00:00Z";
    return job;
}

inline EnsembleOptions example_options() {
    EnsembleOptions options;
    options.seed = 20260817;
    options.replicates = 2;
    options.walkers = 4;
    options.effective_draws = 1234.5;
    options.max_steps = 4000;
    options.store_every = 3;
    options.kernels.stretch = 0.25;
    options.kernels.differential_evolution = 0.7;
    options.kernels.independence = 0.05;
    return options;
}

inline std::vector<Parameter> example_parameters() {
    return {{"velocity.x", "c", "observer's velocity, x component", Role::sampled},
            {"velocity.y", "c", "observer's velocity, y component", Role::sampled},
            {"velocity.z", "c", "observer's velocity, z component", Role::sampled},
            {"intrinsic.all.x", "1", "intrinsic dipole, x component", Role::constant},
            {"intrinsic.all.y", "1", "intrinsic dipole, y component", Role::constant},
            {"intrinsic.all.z", "1", "intrinsic dipole, z component", Role::constant},
            {"monopole.dunlin.faint", "1/sr", "sources per steradian", Role::redrawn}};
}

inline std::vector<VectorParameter> example_vectors() {
    return {{"velocity", 0, true, true}, {"intrinsic.all", 3, false, true}};
}

/// Rows [first, first + n_rows): the value in row r, replicate k, walker w, parameter p is
/// ((r 10 + k) 10 + w) 10 + p, divided by 8; log posterior and likelihood without p, negative.
inline Draws example_draws(Eigen::Index first, Eigen::Index n_rows) {
    Draws draws;
    draws.n_rows = n_rows;
    draws.n_replicates = 2;
    draws.n_walkers = 4;
    draws.n_parameters = 7;
    for (Eigen::Index row = first; row < first + n_rows; ++row)
        for (Eigen::Index replicate = 0; replicate < 2; ++replicate)
            for (Eigen::Index walker = 0; walker < 4; ++walker) {
                const auto place = static_cast<double>((row * 10 + replicate) * 10 + walker);
                draws.log_posterior.push_back(-place / 8.0);
                draws.log_likelihood.push_back(-place / 16.0);
                for (int parameter = 0; parameter < 7; ++parameter)
                    draws.value.push_back((place * 10.0 + parameter) / 8.0);
            }
    return draws;
}

inline WarmUp example_warm_up() {
    WarmUp warm_up;
    warm_up.buffer = example_draws(1000, 3);
    for (std::size_t place = 6; place < warm_up.buffer.value.size(); place += 7)
        warm_up.buffer.value[place] = std::numeric_limits<double>::quiet_NaN();
    warm_up.buffer.log_likelihood[5] = -std::numeric_limits<double>::infinity();
    warm_up.step = {64, 128, 192};
    warm_up.settled = true;
    warm_up.discarded = 192;
    warm_up.store_every = 3;
    warm_up.warnings = {"The counts do not hold velocity.x."};
    return warm_up;
}

/// The state after `n_rows` stored rows.
inline EnsembleState example_state(std::int64_t n_rows) {
    EnsembleState state;
    state.step = 192 + 3 * n_rows;
    state.look = n_rows / 4;
    state.tally.tried = {100 * n_rows, 200 * n_rows, 0};
    state.tally.taken = {30 * n_rows, 50 * n_rows, 0};
    state.evaluations = {{"moment", 290 * n_rows}, {"pixel", 10 * n_rows}};
    for (int value = 0; value < 2 * 4 * 5; ++value)
        state.coordinates.push_back(static_cast<double>(n_rows) + std::ldexp(value, -10));
    for (int walker = 0; walker < 2 * 4; ++walker) {
        state.log_posterior.push_back(-static_cast<double>(n_rows + walker));
        state.log_likelihood.push_back(-0.0);
    }
    return state;
}

inline Outcome example_outcome(std::int64_t n_rows) {
    Outcome outcome;
    outcome.end = Outcome::End::converged;
    outcome.steps = 192 + 3 * n_rows + 1;  // one more than was stored
    outcome.discarded = 192;
    outcome.store_every = 3;
    outcome.n_rows = n_rows;
    outcome.warm_up_settled = true;
    outcome.tally.tried = {1000, 2000, 3};
    outcome.tally.taken = {300, 500, 1};
    return outcome;
}

inline ChainWriter begin_example(const std::filesystem::path& path) {
    return ChainWriter(path,
                       example_provenance(),
                       example_parameters(),
                       example_vectors(),
                       example_counts(),
                       example_options());
}

/// Three blocks, of 3, 0 and 2 rows, and the end.
inline void write_example_chain(const std::filesystem::path& path) {
    ChainWriter writer = begin_example(path);
    writer.warm_up(example_warm_up());
    writer.block(example_draws(0, 3), example_state(3));
    writer.block(example_draws(3, 0), example_state(3));
    writer.block(example_draws(3, 2), example_state(5));
    writer.finish(example_outcome(5), "2026-08-17T11:30:00Z");
}

}  // namespace deviascope::test
