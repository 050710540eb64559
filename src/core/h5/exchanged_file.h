// SPDX-License-Identifier: GPL-2.0-or-later
// CORE (private): a file that grows, and is complete at every instant
#pragma once

#include <filesystem>
#include <functional>

#include "core/descriptor.h"
#include "core/h5/draft_file.h"
#include "core/h5/writer.h"

namespace deviascope::h5 {

using Edit = std::function<void(Writer&)>;

/// Removes what a process that was cut off has left beside a file: `<path>.tmp`, `.next`,
/// `.old`. Nobody may be writing it: the caller holds a lock.
void remove_leftovers(const std::filesystem::path& path) noexcept;

/// A file that is changed again and again without ever being touched: each change is written to
/// a second file, `<path>.next`, which then changes places with it in one system call
/// (renameat2, EXCHANGE). What was the file is the next second one, and needs only the pages it
/// lacks: time goes with what changed last and now, not with the size of the file.
///
/// A reader finds a complete, closed file at any time; one that has the file open (and holds
/// the library's usual lock) keeps the old content: a new second file is made then. Where the
/// file system cannot exchange, three names change one after another (`<path>.old`), the file
/// itself still in one step.
class ExchangedFile {
  public:
    /// A file that is there. One process at a time: the caller holds a lock.
    explicit ExchangedFile(const std::filesystem::path& path);
    /// Removes the second file.
    ~ExchangedFile();
    ExchangedFile(const ExchangedFile&) = delete;
    ExchangedFile& operator=(const ExchangedFile&) = delete;

    /// When this returns, the change is on the disk. Memory of its size is kept.
    /// Errors: OutputError, or what `edit` throws; then the file is as it was before, or (where
    /// only the folder could not be put on the disk) as it is after.
    void change(const Edit& edit);

  private:
    void open_main();
    void prepare_shadow();
    void make_shadow();
    void change_places();
    void drop_shadow() noexcept;

    std::filesystem::path path_, shadow_path_, old_path_;
    Descriptor main_, shadow_;
    Draft last_;  ///< change that the file has and the shadow lacks
};

}  // namespace deviascope::h5
