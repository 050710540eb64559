// SPDX-License-Identifier: GPL-2.0-or-later
// CORE (private): files that are, at every instant, either the old one or the new one
#pragma once

#include <filesystem>
#include <functional>

#include "core/h5/writer.h"

namespace deviascope::h5 {

using Edit = std::function<void(Writer&)>;

/// Writes a new file: in memory, then under the name `<path>.tmp`, put on the disk, renamed to
/// `path` (replacing what is there), and the folder put on the disk.
/// Errors: OutputError, or what `fill` throws; then `path` is as it was and the temporary file
/// is gone.
void write_file(const std::filesystem::path& path, const Edit& fill);

/// Changes a file without ever touching it: the changed copy takes its place as in write_file.
/// A reader finds a complete, closed file at any time; one that has the file open keeps the old
/// content. When this returns, the change is on the disk. Time grows with the size of the file.
/// Errors: as write_file.
void change_file(const std::filesystem::path& path, const Edit& change);

}  // namespace deviascope::h5
