// SPDX-License-Identifier: GPL-2.0-or-later
// ensemble -> CHAIN -> summary
#pragma once

#include <filesystem>
#include <memory>

#include "deviascope/chain/chain.h"

namespace deviascope {

/// Writes chains.h5 (schema 1; layout in the README) block by block.
///
/// The file is complete and closed after every call, and replaced as a whole: a reader may open
/// it at any time, and whatever happens during a call, what earlier calls stored stays as it
/// was. When a call returns, its content is on the disk.
/// Errors: OutputError (path, step, reason; what is safe); the writer must then be given up.
/// InternalError where sizes do not fit each other. Threads: main thread only.
class ChainWriter : public DrawSink {
  public:
    /// Begins a new file. Errors: OutputError where `path` exists: a chain is never replaced
    /// here.
    ChainWriter(const std::filesystem::path& path,
                const Provenance& provenance,
                const std::vector<Parameter>& parameters,
                const std::vector<VectorParameter>& vectors,
                const Counts& counts,
                const EnsembleOptions& options);
    /// Goes on with a file that holds at least one block; the next rows follow the last stored
    /// one. Errors: InputError where the file cannot be continued.
    explicit ChainWriter(const std::filesystem::path& path);
    ~ChainWriter() override;

    /// Stores the warm-up; once, before the first block.
    void warm_up(const WarmUp& warm_up) override;
    /// Appends rows (none is allowed) and the state after the last of them.
    void block(const Draws& rows, const EnsembleState& state) override;
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
