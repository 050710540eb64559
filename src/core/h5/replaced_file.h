// SPDX-License-Identifier: GPL-2.0-or-later
// CORE (private): files that are, at every instant, either the old one or the new one
#pragma once

#include <filesystem>

#include "core/h5/exchanged_file.h"

namespace deviascope::h5 {

/// Writes a new file: in memory, then under the name `<path>.tmp`, put on the disk, renamed to
/// `path` (replacing what is there), and the folder put on the disk.
/// Errors: OutputError, or what `fill` throws; then `path` is as it was and the temporary file
/// is gone.
void write_file(const std::filesystem::path& path, const Edit& fill);

/// Changes a file once, as ExchangedFile does.
void change_file(const std::filesystem::path& path, const Edit& change);

}  // namespace deviascope::h5
