// SPDX-License-Identifier: GPL-2.0-or-later
// CORE (private): files that are, at every instant, either the old one or the new one
#pragma once

#include <filesystem>
#include <functional>

#include "core/h5/writer.h"

namespace deviascope::h5 {

using Edit = std::function<void(Writer&)>;

/// Writes a new file: under the name `<path>.tmp`, closed, put on the disk, renamed to `path`
/// (replacing what is there), and the folder put on the disk.
/// Errors: OutputError, or what `fill` throws; then `path` is as it was and the temporary file
/// is gone.
void write_file(const std::filesystem::path& path, const Edit& fill);

/// Changes a file without ever touching it: a copy `<path>.next` is changed, closed, put on the
/// disk, and takes its place by one rename. A reader finds a complete, closed file at any time;
/// one that has the file open keeps the old content. When this returns, the change is safe.
/// Errors: as write_file.
void change_file(const std::filesystem::path& path, const Edit& change);

/// Has the system write a file, or the entries of a folder, to the disk (fsync).
/// Errors: OutputError.
void put_on_disk(const std::filesystem::path& path);

}  // namespace deviascope::h5
