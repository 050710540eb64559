// SPDX-License-Identifier: GPL-2.0-or-later
// ensemble -> CHAIN -> summary
#pragma once

#include <filesystem>
#include <memory>

#include "deviascope/chain/chain.h"

namespace deviascope {

/// The right to write a chain file: an exclusive lock on the file `<chain>.lock` beside it.
/// Copies share it; the last of them gives it up and removes that file. Whoever gets it clears
/// away what a process that was cut off has left beside the chain.
class ChainLock {
  public:
    /// Errors: OutputError where another process holds it, or the file cannot be made.
    ChainLock(const std::filesystem::path& chain);

    /// Path of the chain file.
    const std::filesystem::path& chain() const;

  private:
    struct Parts;
    std::shared_ptr<const Parts> parts_;
};

/// Writes chains.h5 (schema 1; layout in the README) block by block.
///
/// The file is complete and closed after every call, and replaced in one step: a reader may
/// open it at any time, and whatever happens during a call, what earlier calls stored stays as
/// it was. When a call returns, its content is on the disk. The time of a call goes with what
/// it stores, not with the size of the file. While it lives, `chains.h5.next` lies beside it.
/// Errors: OutputError (path, step, reason; what is safe); the writer must then be given up.
/// InternalError where sizes do not fit each other. Threads: any, but only one at a time may
/// work on any HDF5 file.
class ChainWriter : public DrawSink {
  public:
    /// Begins a new file. Errors: OutputError where it exists: a chain is never replaced here.
    ChainWriter(ChainLock lock,
                const Provenance& provenance,
                const std::vector<Parameter>& parameters,
                const std::vector<VectorParameter>& vectors,
                const Counts& counts,
                const EnsembleOptions& options);
    /// Goes on with a file that holds at least one block; the next rows follow the last stored
    /// one.
    /// @param stored  the file's content, read while the lock was held
    /// Errors: InputError where it holds no block.
    ChainWriter(ChainLock lock, const Chain& stored);
    ~ChainWriter() override;

    /// Stores the warm-up; once, before the first block.
    void warm_up(const WarmUp& warm_up) override;
    /// Appends rows (none is allowed) and the state after the last of them.
    void block(const Draws& rows, const EnsembleState& state) override;
    /// Rows of a chunk of the file: as many as the first block had, or an even part of them. A
    /// chunk that is not full is written again, elsewhere in the file, when it is added to.
    std::int64_t rows_together(Eigen::Index n_rows) const override;
    /// Marks the end: outcome and end time.
    void finish(const Outcome& outcome, const std::string& ended);

  private:
    struct Parts;
    std::unique_ptr<Parts> parts_;
};

/// Reads a chain, finished or not, bit for bit as it was given to the writer.
/// Errors: InputError: not ours, newer schema, damaged, cut short, sizes that disagree. Sizes
/// are checked before memory is taken. Threads: main thread only.
Chain read_chain(const std::filesystem::path& path);

}  // namespace deviascope
