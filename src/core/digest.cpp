// SPDX-License-Identifier: GPL-2.0-or-later
#include "deviascope/core/digest.h"

#include <fmt/format.h>

#include <algorithm>
#include <bit>
#include <cerrno>
#include <cstring>
#include <fstream>
#include <vector>

#include "deviascope/core/error.h"
#include "deviascope/core/grouped_number.h"

namespace deviascope {

namespace {

// FIPS 180-4, section 4.2.2: the first 32 bits of the fractional parts of the cube roots of the
// first 64 primes.
constexpr std::array<std::uint32_t, 64> round_constant = {
    0x428a2f98, 0x71374491, 0xb5c0fbcf, 0xe9b5dba5, 0x3956c25b, 0x59f111f1, 0x923f82a4,
    0xab1c5ed5, 0xd807aa98, 0x12835b01, 0x243185be, 0x550c7dc3, 0x72be5d74, 0x80deb1fe,
    0x9bdc06a7, 0xc19bf174, 0xe49b69c1, 0xefbe4786, 0x0fc19dc6, 0x240ca1cc, 0x2de92c6f,
    0x4a7484aa, 0x5cb0a9dc, 0x76f988da, 0x983e5152, 0xa831c66d, 0xb00327c8, 0xbf597fc7,
    0xc6e00bf3, 0xd5a79147, 0x06ca6351, 0x14292967, 0x27b70a85, 0x2e1b2138, 0x4d2c6dfc,
    0x53380d13, 0x650a7354, 0x766a0abb, 0x81c2c92e, 0x92722c85, 0xa2bfe8a1, 0xa81a664b,
    0xc24b8b70, 0xc76c51a3, 0xd192e819, 0xd6990624, 0xf40e3585, 0x106aa070, 0x19a4c116,
    0x1e376c08, 0x2748774c, 0x34b0bcb5, 0x391c0cb3, 0x4ed8aa4a, 0x5b9cca4f, 0x682e6ff3,
    0x748f82ee, 0x78a5636f, 0x84c87814, 0x8cc70208, 0x90befffa, 0xa4506ceb, 0xbef9a3f7,
    0xc67178f2};

std::uint32_t big_endian_word(const unsigned char* bytes) {
    return (std::uint32_t{bytes[0]} << 24U) | (std::uint32_t{bytes[1]} << 16U) |
           (std::uint32_t{bytes[2]} << 8U) | std::uint32_t{bytes[3]};
}

}  // namespace

// FIPS 180-4, section 5.3.3: square roots of the first eight primes.
Digest::Digest()
    : state_{0x6a09e667,
             0xbb67ae85,
             0x3c6ef372,
             0xa54ff53a,
             0x510e527f,
             0x9b05688c,
             0x1f83d9ab,
             0x5be0cd19} {}

// FIPS 180-4, section 6.2.2; symbols as there.
void Digest::absorb(const unsigned char* block) {
    std::array<std::uint32_t, 64> w{};
    for (std::size_t t = 0; t < 16; ++t) w[t] = big_endian_word(block + 4 * t);
    for (std::size_t t = 16; t < 64; ++t) {
        const std::uint32_t s0 =
            std::rotr(w[t - 15], 7) ^ std::rotr(w[t - 15], 18) ^ (w[t - 15] >> 3U);
        const std::uint32_t s1 =
            std::rotr(w[t - 2], 17) ^ std::rotr(w[t - 2], 19) ^ (w[t - 2] >> 10U);
        w[t] = s1 + w[t - 7] + s0 + w[t - 16];
    }
    auto [a, b, c, d, e, f, g, h] = state_;
    for (std::size_t t = 0; t < 64; ++t) {
        const std::uint32_t sum1 = std::rotr(e, 6) ^ std::rotr(e, 11) ^ std::rotr(e, 25);
        const std::uint32_t t1 = h + sum1 + ((e & f) ^ (~e & g)) + round_constant[t] + w[t];
        const std::uint32_t sum0 = std::rotr(a, 2) ^ std::rotr(a, 13) ^ std::rotr(a, 22);
        const std::uint32_t t2 = sum0 + ((a & b) ^ (a & c) ^ (b & c));
        h = g;
        g = f;
        f = e;
        e = d + t1;
        d = c;
        c = b;
        b = a;
        a = t1 + t2;
    }
    const std::array<std::uint32_t, 8> sums = {a, b, c, d, e, f, g, h};
    for (std::size_t i = 0; i < 8; ++i) state_[i] += sums[i];
}

void Digest::add(std::span<const unsigned char> bytes) {
    n_bytes_ += bytes.size();
    while (!bytes.empty()) {
        if (n_pending_ == 0 && bytes.size() >= pending_.size()) {
            absorb(bytes.data());
            bytes = bytes.subspan(pending_.size());
            continue;
        }
        const std::size_t n = std::min(bytes.size(), pending_.size() - n_pending_);
        std::memcpy(pending_.data() + n_pending_, bytes.data(), n);
        n_pending_ += n;
        bytes = bytes.subspan(n);
        if (n_pending_ == pending_.size()) {
            absorb(pending_.data());
            n_pending_ = 0;
        }
    }
}

void Digest::add(std::string_view text) {
    add(std::span(reinterpret_cast<const unsigned char*>(text.data()), text.size()));
}

std::string Digest::hex() {
    // Section 5.1.1: one bit, zeros, and the length in bits as a big-endian 64-bit word.
    const std::uint64_t n_bits = n_bytes_ * 8;
    const unsigned char one = 0x80;
    add(std::span(&one, 1));
    const unsigned char zero = 0;
    while (n_pending_ != 56) add(std::span(&zero, 1));
    std::array<unsigned char, 8> length{};
    for (std::size_t i = 0; i < 8; ++i)
        length[i] = static_cast<unsigned char>(n_bits >> (56U - 8U * i));
    add(length);
    std::string out;
    for (const std::uint32_t word : state_) out += fmt::format("{:08x}", word);
    return out;
}

std::string digest_of(std::string_view text) {
    Digest digest;
    digest.add(text);
    return digest.hex();
}

std::string digest_of_file(const std::filesystem::path& path, const Progress& progress) {
    const auto cannot = [&](const char* reason) {
        return InputError({path.string(),
                           fmt::format("cannot be read ({})", reason),
                           "a readable file is needed",
                           ""});
    };
    std::ifstream file(path, std::ios::binary);
    if (!file) throw cannot(std::strerror(errno));
    Digest digest;
    std::vector<char> buffer(std::size_t{1} << 20U);
    for (std::int64_t megabytes = 1; file; ++megabytes) {
        file.read(buffer.data(), static_cast<std::streamsize>(buffer.size()));
        digest.add(std::string_view(buffer.data(), static_cast<std::size_t>(file.gcount())));
        if (progress)
            progress(fmt::format(
                "{}: {} MiB digested", path.filename().string(), grouped(megabytes)));
    }
    if (file.bad()) throw cannot(std::strerror(errno));
    return digest.hex();
}

}  // namespace deviascope
