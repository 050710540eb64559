// SPDX-License-Identifier: GPL-2.0-or-later
#include "core/h5/fletcher32.h"

#include <algorithm>
#include <array>
#include <cstring>

#include "deviascope/core/error.h"

namespace deviascope::h5 {
namespace {

constexpr std::size_t n_lanes = 16;
/// Rounds after which the second sum of a lane still fits: 360 * 361 / 2 * 65535 < 2^32.
constexpr std::size_t most_rounds = 360;

using Word = std::uint16_t;

/// Both sums, of words in the machine's byte order.
struct Sums {
    std::uint64_t first = 0, second = 0;

    /// As many whole rounds of all lanes.
    void add_rounds(const char* bytes, std::size_t n_rounds) {
        std::array<std::uint32_t, n_lanes> a{}, b{};
        for (std::size_t round = 0; round < n_rounds; ++round) {
            std::array<Word, n_lanes> words;
            std::memcpy(words.data(), bytes + round * sizeof words, sizeof words);
            for (std::size_t lane = 0; lane < n_lanes; ++lane) {
                a[lane] += words[lane];
                b[lane] += a[lane];
            }
        }
        second += n_rounds * n_lanes * first;
        for (std::size_t lane = 0; lane < n_lanes; ++lane) {
            first += a[lane];
            second += n_lanes * std::uint64_t{b[lane]} - lane * std::uint64_t{a[lane]};
        }
        reduce();
    }

    void add(Word word) {
        first += word;
        second += first;
        reduce();
    }

    /// Modulo 65535; what is not 0 stays so.
    void reduce() {
        for (std::uint64_t* sum : {&first, &second})
            if (*sum > 0) *sum = (*sum - 1) % 65535 + 1;
    }
};

std::uint32_t from_big_endian(std::uint64_t sum) {
    const auto word = static_cast<Word>(sum);
    std::array<unsigned char, 2> bytes;
    std::memcpy(bytes.data(), &word, 2);
    return bytes[0] * 256U + bytes[1];
}

}  // namespace

std::uint32_t fletcher32(std::span<const char> bytes) {
    ensure(bytes.size() % sizeof(Word) == 0, "a checksum is made of whole words");
    constexpr std::size_t round_bytes = n_lanes * sizeof(Word);
    Sums sums;
    while (bytes.size() >= round_bytes) {
        const std::size_t n_rounds = std::min(most_rounds, bytes.size() / round_bytes);
        sums.add_rounds(bytes.data(), n_rounds);
        bytes = bytes.subspan(n_rounds * round_bytes);
    }
    for (; !bytes.empty(); bytes = bytes.subspan(sizeof(Word))) {
        Word word = 0;
        std::memcpy(&word, bytes.data(), sizeof word);
        sums.add(word);
    }
    return from_big_endian(sums.second) << 16U | from_big_endian(sums.first);
}

}  // namespace deviascope::h5
