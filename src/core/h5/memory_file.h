// SPDX-License-Identifier: GPL-2.0-or-later
// CORE (private to this folder): an HDF5 file in memory
#pragma once

#include <cstddef>
#include <cstdlib>
#include <memory>
#include <string>

#include "core/h5/session.h"

namespace deviascope::h5 {

/// An HDF5 file that lives in memory, made with the library's "core" driver. The library's call
/// for the bytes of an open file gives a superblock whose checksum is wrong (1.10.8), so the
/// bytes are taken over from the library at the moment in which it closes the file.
class MemoryFile {
  public:
    /// A new file, or one to be changed. Errors: H5::Exception.
    explicit MemoryFile(const std::string& image);
    ~MemoryFile();
    MemoryFile(const MemoryFile&) = delete;
    MemoryFile& operator=(const MemoryFile&) = delete;

    H5::H5File& file() { return file_; }
    /// Closes the file and gives its bytes. Errors: H5::Exception.
    std::string close();

  private:
    struct Block {
        char* bytes = nullptr;  ///< of malloc
        std::size_t size = 0;
        bool is_ours = false;  ///< the library has given it up
        ~Block() {
            if (is_ours) std::free(bytes);
        }
    };
    static H5FD_file_image_callbacks_t callbacks(Block* block);

    std::unique_ptr<Block> block_;
    H5::H5File file_;
};

}  // namespace deviascope::h5
