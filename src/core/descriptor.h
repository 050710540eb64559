// SPDX-License-Identifier: GPL-2.0-or-later
// CORE (private): open files and folders of the system
#pragma once

#include <cstdint>
#include <filesystem>
#include <span>
#include <string_view>

#include "deviascope/core/error.h"

namespace deviascope {

/// The error of the last system call (errno) about `path`: `path: what: reason`.
OutputError system_error(const std::filesystem::path& path, const std::string& what);

/// An open file or folder; closed with it. Errors of all members: OutputError with path and
/// the system's reason.
class Descriptor {
  public:
    Descriptor() = default;
    /// @param flags  of open(2); close-on-exec is added
    Descriptor(const std::filesystem::path& path, int flags);
    ~Descriptor();
    Descriptor(Descriptor&& other) noexcept;
    Descriptor& operator=(Descriptor&& other) noexcept;

    bool is_open() const { return number_ >= 0; }
    const std::filesystem::path& path() const { return path_; }
    int number() const { return number_; }

    std::uint64_t size() const;
    void resize(std::uint64_t n_bytes) const;
    void write(std::string_view bytes, std::uint64_t offset) const;
    /// The same, but straight to the disk where the system can do that: it saves the system
    /// what copying costs, several times over. Address, offset and size are multiples of 4096.
    void write_past_cache(std::string_view bytes, std::uint64_t offset) const;
    /// Reads bytes, fewer where the file ends. @returns how many
    std::size_t read(std::span<char> to, std::uint64_t offset) const;
    /// Has the system put it on the disk.
    void sync() const;
    /// Some file systems report failed writes only here.
    void close();

    /// Whether it is the file that is now found under `path`.
    bool is_at(const std::filesystem::path& path) const;
    /// Takes the exclusive lock of flock(2); false where another process holds a lock. Where
    /// the file system knows no locks there is nothing to take, and true is returned.
    bool try_lock() const;
    void unlock() const;

  private:
    /// Writes until the system takes no more: what `bytes` still holds then, errno says why.
    void write_while_taken(std::string_view& bytes, std::uint64_t& offset) const;

    std::filesystem::path path_;
    int number_ = -1;
};

/// Has the system put the names in the folder of `path` on the disk.
void sync_folder_of(const std::filesystem::path& path);

}  // namespace deviascope
