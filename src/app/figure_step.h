// SPDX-License-Identifier: GPL-2.0-or-later
// APP: on top of all stages
#pragma once

#include <filesystem>
#include <optional>
#include <string>
#include <vector>

#include "app/output_folder.h"
#include "app/steps.h"
#include "app/terminal.h"
#include "deviascope/figures/figures.h"

namespace deviascope {

/// A chain, its summary, and the comparison beside it where that has been made of the same job
/// and inputs.
struct ChainResults {
    const Chain& chain;
    const Summarised& summarised;
    std::optional<Comparison> comparison;
};

/// The compare.json in the folder of a chain. One of another job, or that cannot be read, is
/// left out with a warning.
std::optional<Comparison> comparison_beside(const std::filesystem::path& chain_file,
                                            const Provenance& provenance,
                                            Terminal& terminal);

/// summary -> figures: figures, report, tables and sky files of a chain into the folder, in the
/// place of those that are there.
void write_results(const ChainResults& results,
                   const FigureOptions& options,
                   const std::filesystem::path& folder,
                   Terminal& terminal);

/// The same, but only the figures that the options choose.
/// Errors: OutputError where one is there and may not be replaced.
void write_chosen_figures(const ChainResults& results,
                          const FigureOptions& options,
                          const std::filesystem::path& folder,
                          Existing existing,
                          Terminal& terminal);

}  // namespace deviascope
