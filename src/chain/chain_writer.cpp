// SPDX-License-Identifier: GPL-2.0-or-later
#include <fmt/format.h>

#include <optional>
#include <system_error>
#include <utility>

#include "chain/chain_sections.h"
#include "core/h5/reader.h"
#include "core/h5/replaced_file.h"
#include "deviascope/chain/chain_file.h"

namespace deviascope {

using h5::Writer;

struct ChainWriter::Parts {
    ChainLock lock;
    std::optional<h5::ExchangedFile> file;  ///< from the first change on
    std::int64_t n_rows = 0;                ///< stored
    std::int64_t n_walkers = 0;             ///< of all replicates; 0 before the first block
    std::int64_t rows_a_chunk = 1;
    std::int64_t last_step = 0;  ///< of the last block
    bool was_ended = false;      ///< the file says how an earlier run ended

    explicit Parts(ChainLock the_lock) : lock(std::move(the_lock)) {}

    const std::filesystem::path& path() const { return lock.chain(); }
    bool has_blocks() const { return n_walkers > 0; }

    /// Changes the file; an error says what is safe.
    void change(const std::string& what, const h5::Edit& edit);
    /// Runs `call`; an error says what could not be stored and what is safe.
    template <class Call>
    void guard(const std::string& what, Call&& call) const;
    std::string remedy() const;
};

void ChainWriter::Parts::change(const std::string& what, const h5::Edit& edit) {
    guard(what, [&] {
        if (!file) file.emplace(path());
        file->change(edit);
    });
}

template <class Call>
void ChainWriter::Parts::guard(const std::string& what, Call&& call) const {
    try {
        call();
    } catch (const OutputError& error) {
        const Message& cause = error.messages().front();
        throw OutputError(
            {path().string(),
             fmt::format("{} could not be stored: {} ({})", what, cause.found, cause.place),
             "",
             remedy()});
    }
}

std::string ChainWriter::Parts::remedy() const {
    if (!has_blocks()) return "no draws were stored yet; free some space, then start again";
    return fmt::format(
        "{} draws ({} rows, up to step {}) are safe; free some space, then "
        "continue with --resume",
        n_rows * n_walkers,
        n_rows,
        last_step);
}

ChainWriter::ChainWriter(ChainLock lock,
                         const Provenance& provenance,
                         const std::vector<Parameter>& parameters,
                         const std::vector<VectorParameter>& vectors,
                         const Counts& counts,
                         const EnsembleOptions& options)
    : parts_(std::make_unique<Parts>(std::move(lock))) {
    std::error_code ignored;
    if (std::filesystem::exists(std::filesystem::symlink_status(parts_->path(), ignored)))
        throw OutputError({parts_->path().string(),
                           "exists already",
                           "a chain is never written over another",
                           "remove it, choose another folder, or continue it with --resume"});
    parts_->guard("a new chain", [&] {
        h5::write_file(parts_->path(), [&](Writer& writer) {
            write_head(writer, provenance, parameters, vectors, counts, options);
        });
    });
}

ChainWriter::ChainWriter(ChainLock lock, const Chain& stored)
    : parts_(std::make_unique<Parts>(std::move(lock))) {
    if (stored.state.log_posterior.empty())
        throw InputError({parts_->path().string(),
                          "holds no block to go on from",
                          "",
                          "remove it and start again: a warm-up is not continued"});
    parts_->n_rows = stored.draws.n_rows;
    parts_->n_walkers = stored.draws.n_replicates * stored.draws.n_walkers;
    parts_->rows_a_chunk =
        static_cast<std::int64_t>(h5::Reader(parts_->path()).chunk("/draws").front());
    parts_->last_step = stored.state.step;
    parts_->was_ended = stored.outcome.end != Outcome::End::not_run;
}

ChainWriter::~ChainWriter() = default;

void ChainWriter::warm_up(const WarmUp& warm_up) {
    parts_->change(fmt::format("the warm-up of {} steps", warm_up.discarded),
                   [&](Writer& writer) { write_warm_up(writer, warm_up); });
}

void ChainWriter::block(const Draws& rows, const EnsembleState& state) {
    ensure_block(rows, state);
    const std::int64_t n_rows_after = parts_->n_rows + rows.n_rows;
    const std::int64_t rows_a_chunk = rows_together(rows.n_rows);
    parts_->change(fmt::format("the block up to step {}", state.step), [&](Writer& writer) {
        if (!parts_->has_blocks()) create_growing(writer, rows, state, rows_a_chunk);
        if (parts_->was_ended) write_end(writer, Outcome::End::not_run);
        append_block(writer, rows, state, n_rows_after);
    });
    parts_->rows_a_chunk = rows_a_chunk;
    parts_->n_rows = n_rows_after;
    parts_->n_walkers = rows.n_replicates * rows.n_walkers;
    parts_->last_step = state.step;
    parts_->was_ended = false;
}

std::int64_t ChainWriter::rows_together(Eigen::Index n_rows) const {
    return parts_->has_blocks() ? parts_->rows_a_chunk : good_rows_a_chunk(n_rows);
}

void ChainWriter::finish(const Outcome& outcome, const std::string& ended) {
    parts_->change("the outcome", [&](Writer& writer) {
        write_outcome(writer, outcome);
        writer.attribute("/job", "ended", ended);
    });
    parts_->was_ended = true;
}

}  // namespace deviascope
