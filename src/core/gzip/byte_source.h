// SPDX-License-Identifier: GPL-2.0-or-later
// CORE (private): the only place that knows zlib
#pragma once

#include <cstddef>
#include <filesystem>
#include <memory>
#include <span>
#include <string>

namespace deviascope {

/// The bytes of a file from its start, uncompressed on the way where it is a gzip file (told by
/// its first bytes; several members one after the other are one stream: RFC 1952 section 2.2).
/// File names are taken literally.
class ByteSource {
  public:
    /// Errors: InputError: a folder, or cannot be read.
    explicit ByteSource(const std::filesystem::path& path);
    ~ByteSource();
    ByteSource(const ByteSource&) = delete;
    ByteSource& operator=(const ByteSource&) = delete;

    /// Fills `bytes`, fewer only at the end of the file; returns how many.
    /// Errors: InputError: cannot be read; compressed data that are damaged or cut short.
    std::size_t read(std::span<char> bytes);
    bool is_compressed() const;

  private:
    [[noreturn]] void refuse() const;

    struct Closer {
        void operator()(void* file) const noexcept;
    };
    std::filesystem::path path_;
    std::unique_ptr<void, Closer> file_;
};

/// `zlib` and its version.
std::string gzip_library_version();

}  // namespace deviascope
