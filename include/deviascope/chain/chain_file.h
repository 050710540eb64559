// SPDX-License-Identifier: GPL-2.0-or-later
// ensemble -> CHAIN -> summary
#pragma once

#include <filesystem>
#include <memory>

#include "deviascope/chain/chain.h"

namespace deviascope {

/// Writes chains.h5 (schema 1; layout in the README) block by block.
/// The file is complete and closed after every block; a reader may open it at any time.
/// Errors: OutputError (path, step, reason; what is safe).
class ChainWriter : public DrawSink {
  public:
    ChainWriter(const std::filesystem::path& path,
                const Provenance& provenance,
                const std::vector<Parameter>& parameters,
                const std::vector<VectorParameter>& vectors,
                const Counts& counts,
                const EnsembleOptions& options);
    ~ChainWriter() override;

    void warm_up(const WarmUp& warm_up) override;
    void block(const Draws& rows, const EnsembleState& state) override;
    /// Marks the end: outcome and end time.
    void finish(const Outcome& outcome, const std::string& ended);

  private:
    struct Parts;
    std::unique_ptr<Parts> parts_;
};

/// Reads a chain. Errors: InputError: not ours, newer schema, truncated, sizes that disagree.
Chain read_chain(const std::filesystem::path& path);

}  // namespace deviascope
