// SPDX-License-Identifier: GPL-2.0-or-later
#include <algorithm>

#include "chain/chain_layout.h"
#include "chain/chain_sections.h"
#include "chain/columns.h"

namespace deviascope {

namespace {

using h5::Shape;
using h5::Writer;

std::size_t size(Eigen::Index extent) {
    return static_cast<std::size_t>(extent);
}

// Chunks of draws: 100 rows of 16 walkers were measured best; fewer rows, more walkers.
constexpr std::size_t most_rows_a_chunk = 100, walkers_of_most_rows = 16;
constexpr std::size_t blocks_a_chunk = 64;  // of single numbers

/// Chunk of draws of that many rows; walkers are parted evenly.
Shape chunk_of(std::size_t n_rows, const Draws& draws) {
    const std::size_t most_walkers = walkers_of_most_rows * most_rows_a_chunk / n_rows;
    const std::size_t n_walkers = std::max<std::size_t>(size(draws.n_walkers), 1);
    const std::size_t n_chunks = (n_walkers + most_walkers - 1) / most_walkers;
    return {n_rows, 1, (n_walkers + n_chunks - 1) / n_chunks, size(draws.n_parameters)};
}

/// Draws are worth deflating where most walkers stay put from row to row. Where they move, all
/// but the leading digits is noise: a fifth is gained, for ten times the time of writing.
Writer::Packing packing_for(const Draws& rows) {
    const std::size_t n_walkers = size(rows.n_replicates * rows.n_walkers);
    std::size_t n_stayed = 0;
    for (std::size_t place = n_walkers; place < rows.log_posterior.size(); ++place)
        if (rows.log_posterior[place] == rows.log_posterior[place - n_walkers]) ++n_stayed;
    return 2 * n_stayed > rows.log_posterior.size() ? Writer::Packing::deflated
                                                    : Writer::Packing::plain;
}

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

void write_approximation(Writer& writer, const CoordinateGaussian& gaussian) {
    const std::size_t n = size(gaussian.mean.size());
    ensure(size(gaussian.factor.rows()) == n && size(gaussian.factor.cols()) == n,
           "mean and factor of a Gaussian are of one dimension");
    using Rows = Eigen::Matrix<double, Eigen::Dynamic, Eigen::Dynamic, Eigen::RowMajor>;
    const Rows factor = gaussian.factor;
    writer.dataset("/state/approximation_mean",
                   {"mean of the Gaussian the independence kernel draws from, in the "
                    "sampler's coordinates",
                    "",
                    "coordinate"},
                   {n},
                   std::span<const double>(gaussian.mean.data(), n));
    writer.dataset("/state/approximation_factor",
                   {"lower triangular L; the covariance of that Gaussian is L times its "
                    "transpose",
                    "",
                    "coordinate x coordinate"},
                   {n, n},
                   std::span<const double>(factor.data(), n * n));
}

/// Datasets for draws in a group, "" for the root; for rows like these.
void create_draws(Writer& writer,
                  const std::string& group,
                  const Draws& rows,
                  std::size_t rows_a_chunk) {
    const Shape ensemble = ensemble_of(rows);
    const Writer::Packing packing = packing_for(rows);
    writer.growing_reals(group + "/draws",
                         draws_about,
                         and_with(ensemble, size(rows.n_parameters)),
                         chunk_of(rows_a_chunk, rows),
                         packing);
    const Shape chunk = with(rows_a_chunk, ensemble);
    writer.growing_reals(group + "/log_posterior", posterior_about, ensemble, chunk, packing);
    writer.growing_reals(group + "/log_likelihood", likelihood_about, ensemble, chunk, packing);
}

void create_states(Writer& writer, const Shape& ensemble, std::size_t n_coordinates) {
    const auto number = [&](const std::string& name, const std::string& meaning) {
        writer.growing_integers(
            "/state/" + name, {meaning, "1", "block"}, {}, {blocks_a_chunk});
    };
    number("step", "steps each walker had made, warm-up included");
    number("look", "looks passed since the end of the warm-up");
    number("rows", "rows of the draws stored");
    if (n_coordinates > 0)
        writer.growing_reals("/state/coordinates",
                             {"where the walkers stood, in the sampler's coordinates",
                              "",
                              "block x replicate x walker x coordinate"},
                             and_with(ensemble, n_coordinates),
                             with(1, and_with(ensemble, n_coordinates)),
                             Writer::Packing::plain);
    const std::string axes = "block x replicate x walker";
    writer.growing_reals("/state/log_posterior",
                         {posterior_about.meaning, "1", axes},
                         ensemble,
                         with(1, ensemble),
                         Writer::Packing::plain);
    writer.growing_reals("/state/log_likelihood",
                         {likelihood_about.meaning, "1", axes},
                         ensemble,
                         with(1, ensemble),
                         Writer::Packing::plain);
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

void append_draws(Writer& writer, const std::string& group, const Draws& rows) {
    writer.append(group + "/draws", all_of(rows.value));
    writer.append(group + "/log_posterior", all_of(rows.log_posterior));
    writer.append(group + "/log_likelihood", all_of(rows.log_likelihood));
}

void create_evaluations(Writer& writer, const std::vector<EvaluationCount>& evaluations) {
    if (evaluations.empty()) return;
    std::vector<std::string> ways;
    for (const EvaluationCount& one : evaluations) ways.push_back(one.way);
    writer.group("/evaluations", "evaluations of the density, summed from the beginning");
    writer.dataset("/evaluations/engine", {"which engine answered", "", "engine"}, ways);
    writer.growing_integers("/evaluations/times",
                            {"evaluations up to the end of a block", "1", "block x engine"},
                            {ways.size()},
                            {blocks_a_chunk, ways.size()});
}

void append_evaluations(Writer& writer, const std::vector<EvaluationCount>& evaluations) {
    std::vector<std::int64_t> times;
    for (const EvaluationCount& one : evaluations) times.push_back(one.times);
    if (!times.empty()) writer.append("/evaluations/times", all_of(times));
}

void append_number(Writer& writer, const std::string& path, std::int64_t number) {
    writer.append(path, std::span<const std::int64_t>(&number, 1));
}

}  // namespace

void write_warm_up(Writer& writer, const WarmUp& warm_up) {
    const Draws& buffer = warm_up.buffer;
    ensure_sizes(buffer);
    ensure(warm_up.step.size() == size(buffer.n_rows), "each row of the warm-up has a step");
    writer.group("/warm_up",
                 "thinned rows of the warm-up, no draws of the posterior; redrawn parameters "
                 "are not a number");
    writer.dataset("/warm_up/step",
                   {"steps each walker had made at a row", "1", "row"},
                   {warm_up.step.size()},
                   all_of(warm_up.step));
    create_draws(writer, "/warm_up", buffer, size(good_rows_a_chunk(buffer.n_rows)));
    append_draws(writer, "/warm_up", buffer);
    writer.attribute("/state", "end_of_warm_up", warm_up.discarded);
    writer.attribute("/state", "warm_up_settled", std::int64_t{warm_up.settled});
    writer.attribute("/state", "store_every", warm_up.store_every);
    if (warm_up.approximation) write_approximation(writer, *warm_up.approximation);
    if (!warm_up.warnings.empty())
        writer.dataset("/state/warnings",
                       {"what was doubtful before the first step", "", "warning"},
                       warm_up.warnings);
}

void ensure_block(const Draws& rows, const EnsembleState& state) {
    ensure_sizes(rows);
    const std::size_t n_walkers = h5::n_elements(ensemble_of(rows));
    ensure(n_walkers > 0 && state.log_posterior.size() == n_walkers &&
               state.log_likelihood.size() == n_walkers &&
               state.coordinates.size() % n_walkers == 0,
           "a state has a place and densities for each walker");
}

std::int64_t good_rows_a_chunk(Eigen::Index n_rows) {
    constexpr auto most = static_cast<std::int64_t>(most_rows_a_chunk);
    const std::int64_t n_chunks = std::max<std::int64_t>(1, (n_rows + most - 1) / most);
    return std::max<std::int64_t>(1, (n_rows + n_chunks - 1) / n_chunks);
}

void create_growing(Writer& writer,
                    const Draws& rows,
                    const EnsembleState& state,
                    std::int64_t rows_a_chunk) {
    const Shape ensemble = ensemble_of(rows);
    create_draws(writer, "", rows, size(rows_a_chunk));
    create_states(writer, ensemble, state.coordinates.size() / h5::n_elements(ensemble));
    create_tally(writer);
    create_evaluations(writer, state.evaluations);
}

void append_block(Writer& writer,
                  const Draws& rows,
                  const EnsembleState& state,
                  std::int64_t n_rows_after) {
    append_draws(writer, "", rows);
    append_number(writer, "/state/step", state.step);
    append_number(writer, "/state/look", state.look);
    append_number(writer, "/state/rows", n_rows_after);
    if (!state.coordinates.empty())
        writer.append("/state/coordinates", all_of(state.coordinates));
    writer.append("/state/log_posterior", all_of(state.log_posterior));
    writer.append("/state/log_likelihood", all_of(state.log_likelihood));
    writer.append("/kernel_tally/tried", std::span<const std::int64_t>(state.tally.tried));
    writer.append("/kernel_tally/taken", std::span<const std::int64_t>(state.tally.taken));
    append_evaluations(writer, state.evaluations);
}

void write_end(Writer& writer, Outcome::End end) {
    writer.attribute(
        "/outcome", "end", std::string(chain_layout::word_for(chain_layout::ends, end)));
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

}  // namespace deviascope
