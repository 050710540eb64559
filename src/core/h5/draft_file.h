// SPDX-License-Identifier: GPL-2.0-or-later
// CORE (private): an HDF5 file that is changed in memory only
#pragma once

#include <cstdint>
#include <memory>

#include "core/descriptor.h"
#include "core/h5/pages.h"
#include "core/h5/session.h"

namespace deviascope::h5 {

/// How a file differs from the one it was made from: pages, and the length. Bytes of a page
/// beyond the length are zero or mean nothing.
struct Draft {
    Pages pages;
    std::uint64_t length = 0;

    /// Makes these changes to that file, or makes a new one of an empty file. Errors:
    /// OutputError.
    void write_to(const Descriptor& file) const;
};

/// An HDF5 file of which the library sees the content on the disk, while what it writes stays
/// in memory, page by page: memory and time go with what changes, not with the size of the
/// file. So the library, which keeps no order of its books once a write has failed, never meets
/// one. Made with a file driver of our own (H5FDregister).
class DraftFile {
  public:
    /// @param base  the file to change, only read, and longer alive than this; null: a new file
    /// @param room  memory to use, of pages that are wanted no more
    /// Errors: H5::Exception.
    explicit DraftFile(const Descriptor* base, Pages room = {});
    ~DraftFile();
    DraftFile(const DraftFile&) = delete;
    DraftFile& operator=(const DraftFile&) = delete;

    H5::H5File& file() { return file_; }
    /// Memory for the next bytes that are written in one piece: the file takes it over instead
    /// of copying, if they come to lie at the beginning of a page. Unset; it holds until they
    /// are written, or until more is asked for.
    /// @param n_bytes  most_at_once at most
    char* room_for(std::size_t n_bytes);
    static constexpr std::size_t most_at_once = pages_together * page_bytes;
    /// Closes the file and gives what has changed. Errors: H5::Exception; OutputError where the
    /// base could not be read; std::bad_alloc.
    Draft close();

    /// What the driver works on.
    struct Parts;

  private:
    std::unique_ptr<Parts> parts_;
    H5::H5File file_;
};

}  // namespace deviascope::h5
