// SPDX-License-Identifier: GPL-2.0-or-later
#include <fmt/format.h>

#include <limits>
#include <utility>

#include "chain/chain_layout.h"
#include "core/h5/replaced_file.h"
#include "counts/counts_group.h"
#include "deviascope/chain/chain_file.h"

namespace deviascope {

namespace {

using h5::Shape;
using h5::Writer;

constexpr std::size_t rows_a_chunk = 100, walkers_a_chunk = 16;  // measured best for draws
constexpr std::size_t blocks_a_chunk = 64;                       // of single numbers

template <class Value, std::size_t n>
const char* word_for(const std::array<std::pair<Value, const char*>, n>& words, Value value) {
    for (const auto& [candidate, word] : words)
        if (candidate == value) return word;
    ensure(false, "each value of an enumeration has a word in the file");
    return "";
}

template <class Value>
std::span<const Value> all_of(const std::vector<Value>& values) {
    return values;
}

// ---- what is known at the start ----

void write_inputs(Writer& writer, const std::vector<InputDigest>& inputs) {
    std::vector<std::string> paths, digests;
    std::vector<std::int64_t> sizes;
    for (const InputDigest& input : inputs) {
        paths.push_back(input.path);
        digests.push_back(input.sha256);
        sizes.push_back(input.bytes);
    }
    writer.group("/job/inputs", "files the counts were made from");
    writer.dataset("/job/inputs/path", {"as the job file names it", "", "input"}, paths);
    writer.dataset("/job/inputs/sha256", {"SHA-256 of its bytes", "", "input"}, digests);
    writer.dataset(
        "/job/inputs/bytes", {"size", "byte", "input"}, {sizes.size()}, all_of(sizes));
}

void write_companions(Writer& writer, const std::vector<Companion>& companions) {
    std::vector<std::string> names, paths, texts;
    for (const Companion& companion : companions) {
        names.push_back(companion.name);
        paths.push_back(companion.path);
        texts.push_back(companion.text);
    }
    writer.group("/job/companions", "prior and weights files the job depends on, whole");
    writer.dataset("/job/companions/name", {"as the job file names it", "", "file"}, names);
    writer.dataset("/job/companions/path", {"where it was found", "", "file"}, paths);
    writer.dataset("/job/companions/text", {"its text", "", "file"}, texts);
}

void write_options(Writer& writer, const EnsembleOptions& options) {
    const std::string place = "/job/sampler";
    writer.group(place, "what was asked of the sampler; 0 means: chosen by the program");
    writer.attribute(place, "replicates", std::int64_t{options.replicates});
    writer.attribute(place, "walkers", std::int64_t{options.walkers});
    writer.attribute(place, "effective_draws", options.effective_draws);
    writer.attribute(place, "max_steps", options.max_steps);
    writer.attribute(place, "store_every", options.store_every);
    writer.attribute(place, "fraction.stretch", options.kernels.stretch);
    writer.attribute(
        place, "fraction.differential-evolution", options.kernels.differential_evolution);
    writer.attribute(place, "fraction.independence", options.kernels.independence);
}

void write_job(Writer& writer, const Provenance& job, const EnsembleOptions& options) {
    ensure(job.seed <= std::numeric_limits<std::int64_t>::max(), "a seed is below 2^63");
    writer.group("/job", "where the chain comes from: enough to make it again");
    writer.attribute("/job", "name", job.job_name);
    writer.attribute("/job", "version", job.version);
    writer.attribute(
        "/job", "libraries", job.libraries.empty() ? library_versions() : job.libraries);
    writer.attribute("/job", "seed", static_cast<std::int64_t>(job.seed));
    writer.attribute("/job", "started", job.started);
    writer.attribute("/job", "ended", job.ended);
    writer.dataset("/job/text", {"the job file, whole", "", "job"}, {job.job_text});
    write_companions(writer, job.companions);
    write_inputs(writer, job.inputs);
    write_options(writer, options);
}

void write_vectors(Writer& writer, const std::vector<VectorParameter>& vectors) {
    std::vector<std::string> names;
    std::vector<std::int64_t> first, amplitude_free, direction_free;
    for (const VectorParameter& vector : vectors) {
        names.push_back(vector.name);
        first.push_back(vector.first);
        amplitude_free.push_back(vector.amplitude_free ? 1 : 0);
        direction_free.push_back(vector.direction_free ? 1 : 0);
    }
    const std::string place = "/parameters/vectors/";
    const Shape shape{vectors.size()};
    writer.group("/parameters/vectors", "three neighbouring parameters that form a vector");
    writer.dataset(place + "name", {"name of the vector", "", "vector"}, names);
    writer.dataset(place + "first",
                   {"its x component, as a column of the draws, counted from 0; y and z follow",
                    "1",
                    "vector"},
                   shape,
                   all_of(first));
    writer.dataset(place + "amplitude_free",
                   {"1; 0 where the prior fixes the amplitude", "1", "vector"},
                   shape,
                   all_of(amplitude_free));
    writer.dataset(place + "direction_free",
                   {"1; 0 where the prior fixes the direction", "1", "vector"},
                   shape,
                   all_of(direction_free));
}

void write_parameters(Writer& writer, const std::vector<Parameter>& parameters) {
    std::vector<std::string> names, units, meanings, roles;
    for (const Parameter& parameter : parameters) {
        names.push_back(parameter.name);
        units.push_back(parameter.unit);
        meanings.push_back(parameter.meaning);
        roles.push_back(word_for(chain_layout::roles, parameter.role));
    }
    writer.group("/parameters", "the columns of the draws, in order");
    writer.dataset("/parameters/name", {"name", "", "parameter"}, names);
    writer.dataset("/parameters/unit", {"unit of the draws", "", "parameter"}, units);
    writer.dataset("/parameters/meaning", {"what it is", "", "parameter"}, meanings);
    writer.dataset("/parameters/role",
                   {"`sampled`; `constant`: fixed by its prior; `redrawn`: integrated out and "
                    "drawn from its exact conditional when a row was stored",
                    "",
                    "parameter"},
                   roles);
}

// ---- draws and states ----

const h5::About draws_about{"draws of the parameters; units in /parameters/unit",
                            "",
                            "row x replicate x walker x "
                            "parameter"};
const h5::About posterior_about{
    "log posterior density in the sampled coordinates, relative to the isotropic sky, natural "
    "logarithm",
    "1",
    "row x replicate x walker"};
const h5::About likelihood_about{
    "log likelihood relative to the isotropic sky, monopoles integrated out unless sampled, "
    "natural logarithm",
    "1",
    "row x replicate x walker"};

std::size_t size(Eigen::Index extent) {
    return static_cast<std::size_t>(extent);
}

/// Replicates x walkers.
Shape ensemble_of(const Draws& draws) {
    return {size(draws.n_replicates), size(draws.n_walkers)};
}

Shape with(std::size_t first, Shape rest) {
    rest.insert(rest.begin(), first);
    return rest;
}

Shape and_with(Shape shape, std::size_t last) {
    shape.push_back(last);
    return shape;
}

void ensure_sizes(const Draws& draws) {
    const std::size_t n_walkers = size(draws.n_rows * draws.n_replicates * draws.n_walkers);
    ensure(draws.value.size() == n_walkers * size(draws.n_parameters) &&
               draws.log_posterior.size() == n_walkers &&
               draws.log_likelihood.size() == n_walkers,
           "draws are as many as their extents say");
}

void write_warm_up(Writer& writer, const WarmUp& warm_up) {
    const Draws& buffer = warm_up.buffer;
    ensure_sizes(buffer);
    ensure(warm_up.step.size() == size(buffer.n_rows), "each row of the warm-up has a step");
    const Shape ensemble = ensemble_of(buffer), rows = with(size(buffer.n_rows), ensemble);
    writer.group("/warm_up",
                 "thinned rows of the warm-up, no draws of the posterior; redrawn parameters "
                 "are not a number");
    writer.dataset("/warm_up/step",
                   {"steps each walker had made at a row", "1", "row"},
                   {warm_up.step.size()},
                   all_of(warm_up.step));
    writer.dataset("/warm_up/draws",
                   draws_about,
                   and_with(rows, size(buffer.n_parameters)),
                   all_of(buffer.value),
                   {rows_a_chunk, 1, walkers_a_chunk, size(buffer.n_parameters)});
    writer.dataset(
        "/warm_up/log_posterior", posterior_about, rows, all_of(buffer.log_posterior));
    writer.dataset(
        "/warm_up/log_likelihood", likelihood_about, rows, all_of(buffer.log_likelihood));
    writer.attribute("/state", "end_of_warm_up", warm_up.discarded);
    writer.attribute("/state", "warm_up_settled", std::int64_t{warm_up.settled});
    writer.attribute("/state", "store_every", warm_up.store_every);
}

void create_draws(Writer& writer, const Draws& rows) {
    const Shape ensemble = ensemble_of(rows);
    const std::size_t n_parameters = size(rows.n_parameters);
    writer.growing_reals("/draws",
                         draws_about,
                         and_with(ensemble, n_parameters),
                         {rows_a_chunk, 1, walkers_a_chunk, n_parameters});
    writer.growing_reals(
        "/log_posterior", posterior_about, ensemble, with(rows_a_chunk, ensemble));
    writer.growing_reals(
        "/log_likelihood", likelihood_about, ensemble, with(rows_a_chunk, ensemble));
}

void create_states(Writer& writer, const Shape& ensemble, std::size_t n_coordinates) {
    const auto number = [&](const std::string& name, const std::string& meaning) {
        writer.growing_integers(
            "/state/" + name, {meaning, "1", "block"}, {}, {blocks_a_chunk});
    };
    number("step", "steps each walker had made, warm-up included");
    number("look", "looks passed since the end of the warm-up");
    number("rows", "rows of the draws stored");
    writer.growing_reals("/state/coordinates",
                         {"where the walkers stood, in the sampler's coordinates",
                          "",
                          "block x replicate x walker x coordinate"},
                         and_with(ensemble, n_coordinates),
                         with(1, and_with(ensemble, n_coordinates)));
    const std::string axes = "block x replicate x walker";
    writer.growing_reals("/state/log_posterior",
                         {posterior_about.meaning, "1", axes},
                         ensemble,
                         with(1, ensemble));
    writer.growing_reals("/state/log_likelihood",
                         {likelihood_about.meaning, "1", axes},
                         ensemble,
                         with(1, ensemble));
}

void create_tally(Writer& writer) {
    const auto names = chain_layout::kernel_names();
    writer.group("/kernel_tally", "proposals of each kernel, summed from the beginning");
    writer.dataset("/kernel_tally/kernel",
                   {"name of the kernel", "", "kernel"},
                   std::vector<std::string>(names.begin(), names.end()));
    writer.growing_integers("/kernel_tally/tried",
                            {"proposals made up to the end of a block", "1", "block x kernel"},
                            {n_kernels},
                            {blocks_a_chunk, n_kernels});
    writer.growing_integers(
        "/kernel_tally/taken",
        {"proposals accepted up to the end of a block", "1", "block x kernel"},
        {n_kernels},
        {blocks_a_chunk, n_kernels});
}

void append_number(Writer& writer, const std::string& path, std::int64_t number) {
    writer.append(path, std::span<const std::int64_t>(&number, 1));
}

void append_block(Writer& writer,
                  const Draws& rows,
                  const EnsembleState& state,
                  std::int64_t n_rows_after) {
    writer.append("/draws", all_of(rows.value));
    writer.append("/log_posterior", all_of(rows.log_posterior));
    writer.append("/log_likelihood", all_of(rows.log_likelihood));
    append_number(writer, "/state/step", state.step);
    append_number(writer, "/state/look", state.look);
    append_number(writer, "/state/rows", n_rows_after);
    writer.append("/state/coordinates", all_of(state.coordinates));
    writer.append("/state/log_posterior", all_of(state.log_posterior));
    writer.append("/state/log_likelihood", all_of(state.log_likelihood));
    writer.append("/kernel_tally/tried", std::span<const std::int64_t>(state.tally.tried));
    writer.append("/kernel_tally/taken", std::span<const std::int64_t>(state.tally.taken));
}

void write_end(Writer& writer, Outcome::End end) {
    writer.attribute("/outcome", "end", std::string(word_for(chain_layout::ends, end)));
}

void write_outcome(Writer& writer, const Outcome& outcome) {
    const std::string place = "/outcome";
    write_end(writer, outcome.end);
    writer.attribute(place, "steps", outcome.steps);
    writer.attribute(place, "discarded", outcome.discarded);
    writer.attribute(place, "store_every", outcome.store_every);
    writer.attribute(place, "rows", std::int64_t{outcome.n_rows});
    writer.attribute(place, "warm_up_settled", std::int64_t{outcome.warm_up_settled});
    const auto names = chain_layout::kernel_names();
    for (std::size_t kernel = 0; kernel < n_kernels; ++kernel) {
        writer.attribute(place, "tried." + names[kernel], outcome.tally.tried[kernel]);
        writer.attribute(place, "taken." + names[kernel], outcome.tally.taken[kernel]);
    }
}

}  // namespace

struct ChainWriter::Parts {
    std::filesystem::path path;
    std::int64_t n_rows = 0;     ///< stored
    std::int64_t last_step = 0;  ///< of the last block
    bool has_blocks = false;
    bool was_ended = false;  ///< the file says how an earlier run ended

    /// Changes the file; an error says what is safe.
    void change(const std::string& what, const h5::Edit& edit) const;
};

void ChainWriter::Parts::change(const std::string& what, const h5::Edit& edit) const {
    try {
        h5::change_file(path, edit);
    } catch (const OutputError& error) {
        const Message& cause = error.messages().front();
        throw OutputError(
            {path.string(),
             fmt::format("{}: {} ({})", what, cause.found, cause.place),
             "",
             has_blocks ? fmt::format("{} rows up to step {} are safe in it; free some space, "
                                      "then continue with --resume",
                                      n_rows,
                                      last_step)
                        : "no rows were stored yet; free some space, then start again"});
    }
}

ChainWriter::ChainWriter(const std::filesystem::path& path,
                         const Provenance& provenance,
                         const std::vector<Parameter>& parameters,
                         const std::vector<VectorParameter>& vectors,
                         const Counts& counts,
                         const EnsembleOptions& options)
    : parts_(std::make_unique<Parts>()) {
    parts_->path = path;
    std::error_code ignored;
    if (std::filesystem::exists(std::filesystem::symlink_status(path, ignored)))
        throw OutputError({path.string(),
                           "exists already",
                           "a chain is never written over another",
                           "remove it, choose another folder, or continue it with --resume"});
    h5::write_file(path, [&](Writer& writer) {
        h5::write_identity(writer, chain_layout::identity());
        write_job(writer, provenance, options);
        write_parameters(writer, parameters);
        write_vectors(writer, vectors);
        write_counts_group(writer, "/counts", counts);
        writer.group("/state",
                     "where the sampler stood at the end of each block: enough to go on from");
        writer.group("/outcome", "how the run ended; numbers are per walker, warm-up included");
        write_end(writer, Outcome::End::not_run);
    });
}

ChainWriter::ChainWriter(const std::filesystem::path& path)
    : parts_(std::make_unique<Parts>()) {
    const Chain chain = read_chain(path);
    if (chain.state.coordinates.empty())
        throw InputError({path.string(),
                          "holds no block to go on from",
                          "",
                          "remove it and start again: a warm-up is not continued"});
    parts_->path = path;
    parts_->n_rows = chain.draws.n_rows;
    parts_->last_step = chain.state.step;
    parts_->has_blocks = true;
    parts_->was_ended = chain.outcome.end != Outcome::End::not_run;
}

ChainWriter::~ChainWriter() = default;

void ChainWriter::warm_up(const WarmUp& warm_up) {
    parts_->change(fmt::format("the warm-up of {} steps", warm_up.discarded),
                   [&](Writer& writer) { write_warm_up(writer, warm_up); });
}

void ChainWriter::block(const Draws& rows, const EnsembleState& state) {
    ensure_sizes(rows);
    const Shape ensemble = ensemble_of(rows);
    const std::size_t n_walkers = h5::n_elements(ensemble);
    ensure(n_walkers > 0 && state.log_posterior.size() == n_walkers &&
               state.log_likelihood.size() == n_walkers && !state.coordinates.empty() &&
               state.coordinates.size() % n_walkers == 0,
           "a state has a place and densities for each walker");
    const std::int64_t n_rows_after = parts_->n_rows + rows.n_rows;
    parts_->change(fmt::format("the block up to step {}", state.step), [&](Writer& writer) {
        if (!parts_->has_blocks) {
            create_draws(writer, rows);
            create_states(writer, ensemble, state.coordinates.size() / n_walkers);
            create_tally(writer);
        }
        if (parts_->was_ended) write_end(writer, Outcome::End::not_run);
        append_block(writer, rows, state, n_rows_after);
    });
    parts_->n_rows = n_rows_after;
    parts_->last_step = state.step;
    parts_->has_blocks = true;
    parts_->was_ended = false;
}

void ChainWriter::finish(const Outcome& outcome, const std::string& ended) {
    parts_->change("the outcome", [&](Writer& writer) {
        write_outcome(writer, outcome);
        writer.attribute("/job", "ended", ended);
    });
    parts_->was_ended = true;
}

}  // namespace deviascope
