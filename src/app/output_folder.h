// SPDX-License-Identifier: GPL-2.0-or-later
// APP: on top of all stages
#pragma once

#include <filesystem>
#include <functional>
#include <string>
#include <vector>

#include "app/commands.h"
#include "deviascope/core/error.h"

namespace deviascope {

/// What is to become of results that exist.
enum class Existing { refuse, replace, keep };

/// Where a command on a job file writes: the folder it was given, else one named after the
/// job, here.
std::filesystem::path folder_of(const CommandOptions& options);
/// What its options make of results that exist.
Existing existing_of(const CommandOptions& options);

/// Makes the folder if it is not there. Errors: OutputError (cannot be made; a file stands
/// there).
void make_folder(const std::filesystem::path& folder);

/// Makes the folder if it is not there and checks that none of `files` is in it already. Where
/// they may be there, they stay until new ones take their place, so that a run that fails on
/// its way costs nothing.
/// Errors: OutputError (as make_folder; names all files that exist; a folder stands in the
/// place of one).
void prepare_output(const std::filesystem::path& folder,
                    const std::vector<std::string>& files,
                    Existing existing);

/// Refuses results that exist and do not fit: they were to be kept, or are not to be replaced.
/// Errors: UsageError, OutputError.
[[noreturn]] void refuse_misfit(const Message& message, Existing existing);

/// Figures, report, tables and sky files that are in a folder of results, by their paths in it;
/// files of other names are not ours.
std::vector<std::string> drawn_results(const std::filesystem::path& folder);

/// The first of them in each place, so that a message stays short.
std::vector<std::string> first_drawn_results(const std::filesystem::path& folder);

/// Removes those of `files` that are in the folder. Errors: OutputError.
void remove_results(const std::filesystem::path& folder, const std::vector<std::string>& files);

/// Writes a text file under a temporary name and puts it in place. Errors: OutputError, which
/// says what becomes of the chain.
void write_text(const std::filesystem::path& path, const std::string& text);

/// Writes results by a function that knows of no chain, and makes its OutputErrors say what
/// becomes of one.
void write_by(const std::function<void()>& writer);

}  // namespace deviascope
