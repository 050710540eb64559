// SPDX-License-Identifier: GPL-2.0-or-later
#include "core/descriptor.h"

#include <fcntl.h>
#include <sys/file.h>
#include <sys/stat.h>
#include <unistd.h>

#include <cerrno>
#include <string>
#include <system_error>
#include <utility>

namespace deviascope {

OutputError system_error(const std::filesystem::path& path, const std::string& what) {
    const std::error_code reason(errno, std::generic_category());
    return OutputError({path.string(), what + ": " + reason.message(), "", ""});
}

Descriptor::Descriptor(const std::filesystem::path& path, int flags)
    : path_(path), number_(::open(path.c_str(), flags | O_CLOEXEC, 0666)) {
    if (number_ < 0) throw system_error(path, "cannot be opened");
}

Descriptor::~Descriptor() {
    if (number_ >= 0) ::close(number_);
}

Descriptor::Descriptor(Descriptor&& other) noexcept
    : path_(std::move(other.path_)), number_(std::exchange(other.number_, -1)) {}

Descriptor& Descriptor::operator=(Descriptor&& other) noexcept {
    std::swap(path_, other.path_);
    std::swap(number_, other.number_);
    return *this;
}

std::uint64_t Descriptor::size() const {
    struct stat status {};
    if (::fstat(number_, &status) != 0) throw system_error(path_, "cannot be examined");
    return static_cast<std::uint64_t>(status.st_size);
}

void Descriptor::resize(std::uint64_t n_bytes) const {
    if (::ftruncate(number_, static_cast<off_t>(n_bytes)) != 0)
        throw system_error(path_, "cannot be resized");
}

void Descriptor::write_while_taken(std::string_view& bytes, std::uint64_t& offset) const {
    while (!bytes.empty()) {
        const ssize_t n_written =
            ::pwrite(number_, bytes.data(), bytes.size(), static_cast<off_t>(offset));
        if (n_written < 0 && errno == EINTR) continue;
        if (n_written < 0) return;
        bytes.remove_prefix(static_cast<std::size_t>(n_written));
        offset += static_cast<std::uint64_t>(n_written);
    }
}

void Descriptor::write(std::string_view bytes, std::uint64_t offset) const {
    write_while_taken(bytes, offset);
    if (!bytes.empty()) throw system_error(path_, "cannot be written");
}

void Descriptor::write_past_cache(std::string_view bytes, std::uint64_t offset) const {
    const int flags = ::fcntl(number_, F_GETFL);
    if (flags >= 0 && ::fcntl(number_, F_SETFL, flags | O_DIRECT) == 0) {
        write_while_taken(bytes, offset);
        const int reason = errno;
        ::fcntl(number_, F_SETFL, flags);
        errno = reason;
        // EINVAL: the device wants larger pieces, or has left an odd rest.
        if (!bytes.empty() && reason != EINVAL) throw system_error(path_, "cannot be written");
    }
    write(bytes, offset);
}

std::size_t Descriptor::read(std::span<char> to, std::uint64_t offset) const {
    std::size_t n_read = 0;
    while (n_read < to.size()) {
        const ssize_t n_more = ::pread(number_,
                                       to.data() + n_read,
                                       to.size() - n_read,
                                       static_cast<off_t>(offset + n_read));
        if (n_more < 0 && errno == EINTR) continue;
        if (n_more < 0) throw system_error(path_, "cannot be read");
        if (n_more == 0) break;
        n_read += static_cast<std::size_t>(n_more);
    }
    return n_read;
}

void Descriptor::sync() const {
    if (::fsync(number_) != 0) throw system_error(path_, "cannot be put on the disk");
}

void Descriptor::close() {
    const int number = std::exchange(number_, -1);
    if (::close(number) != 0) throw system_error(path_, "cannot be closed");
}

bool Descriptor::is_at(const std::filesystem::path& path) const {
    struct stat own {};
    struct stat found {};
    return ::fstat(number_, &own) == 0 && ::stat(path.c_str(), &found) == 0 &&
           own.st_dev == found.st_dev && own.st_ino == found.st_ino;
}

bool Descriptor::try_lock() const {
    return ::flock(number_, LOCK_EX | LOCK_NB) == 0 || errno != EWOULDBLOCK;
}

void Descriptor::unlock() const {
    ::flock(number_, LOCK_UN);
}

void sync_folder_of(const std::filesystem::path& path) {
    const std::filesystem::path folder = path.parent_path();
    Descriptor(folder.empty() ? std::filesystem::path(".") : folder, O_RDONLY | O_DIRECTORY)
        .sync();
}

}  // namespace deviascope
