// SPDX-License-Identifier: GPL-2.0-or-later
#include "core/gzip/text_sink.h"

#include <zlib.h>

#include <cerrno>
#include <system_error>

#include "deviascope/core/error.h"

namespace deviascope {

void TextSink::Closer::operator()(void* file) const noexcept {
    gzclose(static_cast<gzFile>(file));
}

TextSink::TextSink(const std::filesystem::path& path, bool gzip)
    : path_(path), temporary_(path.string() + ".partial") {
    errno = 0;
    // `T`: no compression, no gzip header.
    file_.reset(gzopen(temporary_.c_str(), gzip ? "wb6" : "wbT"));
    if (!file_) refuse();
}

TextSink::~TextSink() {
    if (!file_) return;
    file_.reset();
    std::error_code ignored;
    std::filesystem::remove(temporary_, ignored);
}

void TextSink::write(std::string_view text) {
    if (text.empty()) return;
    errno = 0;
    const int n = gzwrite(
        static_cast<gzFile>(file_.get()), text.data(), static_cast<unsigned>(text.size()));
    if (n <= 0) refuse();
}

void TextSink::close() {
    errno = 0;
    const int status = gzclose(static_cast<gzFile>(file_.release()));
    std::error_code failure;
    if (status == Z_OK) std::filesystem::rename(temporary_, path_, failure);
    if (status == Z_OK && !failure) return;
    std::error_code ignored;
    std::filesystem::remove(temporary_, ignored);
    refuse();
}

void TextSink::refuse() const {
    throw OutputError({path_.string(),
                       std::error_code(errno, std::generic_category()).message(),
                       "",
                       "check that the folder exists, may be written to and has space"});
}

}  // namespace deviascope
