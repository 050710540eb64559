// SPDX-License-Identifier: GPL-2.0-or-later
// CORE (private): a text file that is put in place when it is complete
#pragma once

#include <filesystem>
#include <memory>
#include <string_view>

namespace deviascope {

/// Writes a text, plain or as gzip (RFC 1952, without name and time: the same text gives the
/// same bytes), under a temporary name that is removed unless `close` was called.
/// Errors of all members: OutputError.
class TextSink {
  public:
    TextSink(const std::filesystem::path& path, bool gzip);
    ~TextSink();
    TextSink(const TextSink&) = delete;
    TextSink& operator=(const TextSink&) = delete;

    void write(std::string_view text);
    /// Finishes the file and renames it.
    void close();

  private:
    [[noreturn]] void refuse() const;

    struct Closer {
        void operator()(void* file) const noexcept;
    };
    std::filesystem::path path_, temporary_;
    std::unique_ptr<void, Closer> file_;
};

}  // namespace deviascope
