// SPDX-License-Identifier: GPL-2.0-or-later
#include <fmt/format.h>

#include <algorithm>
#include <optional>
#include <utility>

#include "chain/chain_layout.h"
#include "chain/columns.h"
#include "counts/counts_group.h"
#include "deviascope/chain/chain_file.h"

namespace deviascope {

namespace {

using h5::Reader;
using h5::Shape;

template <class Value, std::size_t n>
Value value_of(const Reader& reader,
               const std::string& place,
               const std::string& word,
               const std::array<std::pair<Value, const char*>, n>& words) {
    std::vector<std::string> allowed;
    for (const auto& [value, candidate] : words) {
        if (word == candidate) return value;
        allowed.emplace_back(candidate);
    }
    throw reader.error(
        place, "\"" + word + "\"", fmt::format("{} are allowed", fmt::join(allowed, ", ")));
}

std::vector<std::string> list(const Reader& reader, const std::string& dataset) {
    return reader.texts(dataset, reader.shape(dataset, 1));
}

/// Values that cannot be negative in a sound file.
std::int64_t read_number(const Reader& reader,
                         const std::string& object,
                         const std::string& name) {
    const std::int64_t number = reader.required_integer(object, name);
    if (number < 0)
        throw reader.error(object + "@" + name, std::to_string(number), "0 or more is needed");
    return number;
}

std::vector<InputDigest> read_inputs(const Reader& reader) {
    const auto paths = list(reader, "/job/inputs/path");
    const Shape shape{paths.size()};
    std::vector<InputDigest> inputs(paths.size());
    set_column(inputs, &InputDigest::path, paths);
    set_column(inputs, &InputDigest::sha256, reader.texts("/job/inputs/sha256", shape));
    set_column(inputs, &InputDigest::bytes, reader.integers("/job/inputs/bytes", shape));
    return inputs;
}

std::vector<Companion> read_companions(const Reader& reader) {
    const auto names = list(reader, "/job/companions/name");
    const Shape shape{names.size()};
    std::vector<Companion> companions(names.size());
    set_column(companions, &Companion::name, names);
    set_column(companions, &Companion::path, reader.texts("/job/companions/path", shape));
    set_column(companions, &Companion::text, reader.texts("/job/companions/text", shape));
    return companions;
}

Provenance read_provenance(const Reader& reader) {
    Provenance job;
    job.job_name = reader.required_text("/job", "name");
    job.job_text = reader.texts("/job/text", {1}).front();
    job.companions = read_companions(reader);
    job.inputs = read_inputs(reader);
    job.version = reader.required_text("/job", "version");
    job.libraries = reader.required_text("/job", "libraries");
    job.seed = static_cast<std::uint64_t>(read_number(reader, "/job", "seed"));
    job.started = reader.required_text("/job", "started");
    job.ended = reader.required_text("/job", "ended");
    return job;
}

EnsembleOptions read_options(const Reader& reader, std::uint64_t seed) {
    const std::string place = "/job/sampler";
    EnsembleOptions options;
    options.seed = seed;
    options.replicates = static_cast<int>(read_number(reader, place, "replicates"));
    options.walkers = static_cast<int>(read_number(reader, place, "walkers"));
    options.effective_draws = reader.required_real(place, "effective_draws");
    options.max_steps = read_number(reader, place, "max_steps");
    options.store_every = read_number(reader, place, "store_every");
    options.kernels.stretch = reader.required_real(place, "fraction.stretch");
    options.kernels.differential_evolution =
        reader.required_real(place, "fraction.differential-evolution");
    options.kernels.independence = reader.required_real(place, "fraction.independence");
    return options;
}

std::vector<Parameter> read_parameters(const Reader& reader) {
    const auto names = list(reader, "/parameters/name");
    const Shape shape{names.size()};
    std::vector<Parameter> parameters(names.size());
    set_column(parameters, &Parameter::name, names);
    set_column(parameters, &Parameter::unit, reader.texts("/parameters/unit", shape));
    set_column(parameters, &Parameter::meaning, reader.texts("/parameters/meaning", shape));
    const auto roles = reader.texts("/parameters/role", shape);
    for (std::size_t column = 0; column < names.size(); ++column)
        parameters[column].role =
            value_of(reader, "/parameters/role", roles[column], chain_layout::roles);
    return parameters;
}

std::vector<VectorParameter> read_vectors(const Reader& reader, std::size_t n_parameters) {
    const std::string place = "/parameters/vectors/";
    const auto names = list(reader, place + "name");
    const Shape shape{names.size()};
    const auto first = reader.integers(place + "first", shape);
    const auto amplitude_free = reader.integers(place + "amplitude_free", shape);
    const auto direction_free = reader.integers(place + "direction_free", shape);
    std::vector<VectorParameter> vectors;
    for (std::size_t vector = 0; vector < names.size(); ++vector) {
        if (first[vector] < 0 || static_cast<std::size_t>(first[vector]) + 3 > n_parameters)
            throw reader.error(
                place + "first",
                fmt::format("column {} of {} parameters", first[vector], n_parameters),
                "three columns from there on are needed");
        vectors.push_back({names[vector],
                           static_cast<Eigen::Index>(first[vector]),
                           amplitude_free[vector] != 0,
                           direction_free[vector] != 0});
    }
    return vectors;
}

/// Draws whose datasets are `prefix` + draws, log_posterior, log_likelihood.
Draws read_draws(const Reader& reader, const std::string& prefix, std::size_t n_parameters) {
    const Shape shape = reader.shape(prefix + "draws", 4);
    if (shape[3] != n_parameters)
        throw reader.error(prefix + "draws",
                           fmt::format("{} columns", shape[3]),
                           fmt::format("{} parameters are named", n_parameters));
    Draws draws;
    draws.n_rows = static_cast<Eigen::Index>(shape[0]);
    draws.n_replicates = static_cast<Eigen::Index>(shape[1]);
    draws.n_walkers = static_cast<Eigen::Index>(shape[2]);
    draws.n_parameters = static_cast<Eigen::Index>(shape[3]);
    const Shape rows{shape[0], shape[1], shape[2]};
    draws.log_posterior = reader.reals(prefix + "log_posterior", rows);
    draws.log_likelihood = reader.reals(prefix + "log_likelihood", rows);
    draws.value = reader.large_reals(prefix + "draws", shape);
    return draws;
}

std::optional<CoordinateGaussian> read_approximation(const Reader& reader) {
    const std::string mean = "/state/approximation_mean";
    if (!reader.has(mean)) return std::nullopt;
    const std::size_t n = reader.shape(mean, 1)[0];
    const std::vector<double> values = reader.reals(mean, {n});
    const std::vector<double> factor = reader.reals("/state/approximation_factor", {n, n});
    using Rows = Eigen::Matrix<double, Eigen::Dynamic, Eigen::Dynamic, Eigen::RowMajor>;
    const auto size = static_cast<Eigen::Index>(n);
    return CoordinateGaussian{Eigen::Map<const Eigen::VectorXd>(values.data(), size),
                              Eigen::Map<const Rows>(factor.data(), size, size)};
}

WarmUp read_warm_up(const Reader& reader, std::size_t n_parameters) {
    WarmUp warm_up;
    warm_up.buffer = read_draws(reader, "/warm_up/", n_parameters);
    warm_up.step =
        reader.integers("/warm_up/step", {static_cast<std::size_t>(warm_up.buffer.n_rows)});
    warm_up.settled = read_number(reader, "/state", "warm_up_settled") != 0;
    warm_up.discarded = read_number(reader, "/state", "end_of_warm_up");
    warm_up.store_every = read_number(reader, "/state", "store_every");
    warm_up.approximation = read_approximation(reader);
    if (reader.has("/state/warnings")) warm_up.warnings = list(reader, "/state/warnings");
    return warm_up;
}

KernelTally read_tally(const Reader& reader, std::size_t n_blocks) {
    const auto names = chain_layout::kernel_names();
    const auto found = list(reader, "/kernel_tally/kernel");
    if (found != std::vector<std::string>(names.begin(), names.end()))
        throw reader.error("/kernel_tally/kernel",
                           fmt::format("kernels {}", fmt::join(found, ", ")),
                           fmt::format("{} are known", fmt::join(names, ", ")));
    const auto tried = reader.last_integers("/kernel_tally/tried", {n_blocks, n_kernels});
    const auto taken = reader.last_integers("/kernel_tally/taken", {n_blocks, n_kernels});
    KernelTally tally;
    std::copy(tried.begin(), tried.end(), tally.tried.begin());
    std::copy(taken.begin(), taken.end(), tally.taken.begin());
    return tally;
}

std::vector<EvaluationCount> read_evaluations(const Reader& reader, std::size_t n_blocks) {
    std::vector<EvaluationCount> evaluations;
    if (!reader.has("/evaluations")) return evaluations;
    for (std::string& way : list(reader, "/evaluations/engine"))
        evaluations.push_back({std::move(way), 0});
    const auto times =
        reader.last_integers("/evaluations/times", {n_blocks, evaluations.size()});
    for (std::size_t way = 0; way < evaluations.size(); ++way)
        evaluations[way].times = times[way];
    return evaluations;
}

/// The state after the last block.
EnsembleState read_state(const Reader& reader, const Draws& draws) {
    const Shape blocks = reader.shape("/state/step", 1);
    if (blocks[0] == 0) throw reader.error("/state/step", "no state beside stored draws");
    const std::int64_t n_rows = reader.last_integers("/state/rows", blocks).front();
    if (n_rows != draws.n_rows)
        throw reader.error("/state/rows",
                           fmt::format("{} rows at the last block", n_rows),
                           fmt::format("{} are stored", draws.n_rows));
    const Shape ensemble{blocks[0],
                         static_cast<std::size_t>(draws.n_replicates),
                         static_cast<std::size_t>(draws.n_walkers)};
    EnsembleState state;
    if (reader.has("/state/coordinates")) {  // absent where nothing is sampled
        Shape places = ensemble;
        places.push_back(reader.shape("/state/coordinates", 4)[3]);
        state.coordinates = reader.last_reals("/state/coordinates", places);
    }
    state.step = reader.last_integers("/state/step", blocks).front();
    state.look = reader.last_integers("/state/look", blocks).front();
    state.tally = read_tally(reader, blocks[0]);
    state.evaluations = read_evaluations(reader, blocks[0]);
    state.log_posterior = reader.last_reals("/state/log_posterior", ensemble);
    state.log_likelihood = reader.last_reals("/state/log_likelihood", ensemble);
    return state;
}

/// What can be said of a run without an end: it goes as far as the last block.
Outcome unfinished(const Chain& chain) {
    Outcome outcome;
    outcome.steps = chain.state.step;
    outcome.discarded = chain.warm_up.discarded;
    outcome.store_every = chain.warm_up.store_every;
    outcome.n_rows = chain.draws.n_rows;
    outcome.warm_up_settled = chain.warm_up.settled;
    outcome.tally = chain.state.tally;
    return outcome;
}

Outcome read_outcome(const Reader& reader, const Chain& chain) {
    const std::string place = "/outcome", end = reader.required_text(place, "end");
    Outcome outcome = unfinished(chain);
    outcome.end = value_of(reader, place + "@end", end, chain_layout::ends);
    if (outcome.end == Outcome::End::not_run) return outcome;
    outcome.steps = read_number(reader, place, "steps");
    outcome.discarded = read_number(reader, place, "discarded");
    outcome.store_every = read_number(reader, place, "store_every");
    outcome.n_rows = read_number(reader, place, "rows");
    outcome.warm_up_settled = read_number(reader, place, "warm_up_settled") != 0;
    const auto names = chain_layout::kernel_names();
    for (std::size_t kernel = 0; kernel < n_kernels; ++kernel) {
        outcome.tally.tried[kernel] = read_number(reader, place, "tried." + names[kernel]);
        outcome.tally.taken[kernel] = read_number(reader, place, "taken." + names[kernel]);
    }
    if (outcome.n_rows != chain.draws.n_rows)
        throw reader.error(place + "@rows",
                           fmt::format("{} rows", outcome.n_rows),
                           fmt::format("{} are stored", chain.draws.n_rows));
    return outcome;
}

}  // namespace

Chain read_chain(const std::filesystem::path& path) {
    const Reader reader(path);
    h5::check_identity(reader, chain_layout::identity());
    Chain chain;
    chain.provenance = read_provenance(reader);
    chain.options = read_options(reader, chain.provenance.seed);
    chain.parameters = read_parameters(reader);
    chain.vectors = read_vectors(reader, chain.parameters.size());
    chain.counts = read_counts_group(reader, "/counts");
    chain.draws.n_parameters = static_cast<Eigen::Index>(chain.parameters.size());
    if (reader.has("/warm_up")) chain.warm_up = read_warm_up(reader, chain.parameters.size());
    if (reader.has("/draws")) {
        chain.draws = read_draws(reader, "/", chain.parameters.size());
        chain.state = read_state(reader, chain.draws);
    }
    chain.outcome = read_outcome(reader, chain);
    return chain;
}

}  // namespace deviascope
