// SPDX-License-Identifier: GPL-2.0-or-later
#include "core/gzip/byte_source.h"

#include <fmt/format.h>
#include <zlib.h>

#include <algorithm>
#include <cerrno>
#include <cstring>

#include "deviascope/core/error.h"

namespace deviascope {

namespace {

constexpr unsigned buffer_size = 1U << 18U;
constexpr std::size_t most_at_once = std::size_t{1} << 30U;  // the library counts in int

gzFile raw(void* file) {
    return static_cast<gzFile>(file);
}

InputError cannot_read(const std::filesystem::path& path, const std::string& reason) {
    return InputError({path.string(),
                       fmt::format("cannot be read ({})", reason),
                       "a readable file is needed",
                       ""});
}

}  // namespace

void ByteSource::Closer::operator()(void* file) const noexcept {
    gzclose(raw(file));
}

ByteSource::ByteSource(const std::filesystem::path& path) : path_(path) {
    if (std::filesystem::is_directory(path)) throw cannot_read(path, "it is a folder");
    errno = 0;
    file_.reset(gzopen(path.c_str(), "rb"));
    if (!file_) throw cannot_read(path, std::strerror(errno != 0 ? errno : ENOMEM));
    gzbuffer(raw(file_.get()), buffer_size);
}

ByteSource::~ByteSource() = default;

std::size_t ByteSource::read(std::span<char> bytes) {
    std::size_t filled = 0;
    while (filled < bytes.size()) {
        const std::size_t wanted = std::min(bytes.size() - filled, most_at_once);
        errno = 0;
        const int got =
            gzread(raw(file_.get()), bytes.data() + filled, static_cast<unsigned>(wanted));
        if (got < 0) refuse();
        filled += static_cast<std::size_t>(got);
        if (static_cast<std::size_t>(got) == wanted) continue;
        // The end: of compressed data it must be a whole one.
        int status = Z_OK;
        gzerror(raw(file_.get()), &status);
        if (status != Z_OK && status != Z_STREAM_END) refuse();
        break;
    }
    return filled;
}

bool ByteSource::is_compressed() const {
    return gzdirect(raw(file_.get())) == 0;
}

void ByteSource::refuse() const {
    const int reason = errno;
    int status = Z_OK;
    const char* words = gzerror(raw(file_.get()), &status);
    if (status == Z_ERRNO) throw cannot_read(path_, std::strerror(reason));
    const bool is_short = status == Z_BUF_ERROR;
    // The library puts the file's name before its words.
    const std::string text = words == nullptr ? "" : words;
    const std::size_t colon = text.rfind(": ");
    throw InputError(
        {path_.string(),
         is_short ? std::string("the compressed data end too early")
                  : fmt::format("the compressed data are damaged ({})",
                                colon == std::string::npos ? text : text.substr(colon + 2)),
         "a whole gzip file",
         "fetch or write the file again"});
}

std::string gzip_library_version() {
    return fmt::format("zlib {}", zlibVersion());
}

}  // namespace deviascope
