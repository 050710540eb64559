// SPDX-License-Identifier: GPL-2.0-or-later
// CORE: under all stages
#pragma once

#include <array>
#include <cstdint>
#include <filesystem>
#include <span>
#include <string>
#include <string_view>

#include "deviascope/core/progress.h"

namespace deviascope {

/// SHA-256 (FIPS 180-4) of bytes that arrive in pieces.
class Digest {
  public:
    Digest();
    void add(std::span<const unsigned char> bytes);
    void add(std::string_view text);
    /// 64 lower-case hexadecimal digits; the object must not be used afterwards.
    std::string hex();

  private:
    void absorb(const unsigned char* block);

    std::array<std::uint32_t, 8> state_;
    std::array<unsigned char, 64> pending_{};
    std::size_t n_pending_ = 0;
    std::uint64_t n_bytes_ = 0;
};

/// Digest of a text.
std::string digest_of(std::string_view text);

/// Digest of a file's bytes. Errors: InputError if it cannot be read; what `progress` throws.
std::string digest_of_file(const std::filesystem::path& path, const Progress& progress = {});

}  // namespace deviascope
