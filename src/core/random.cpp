// SPDX-License-Identifier: GPL-2.0-or-later
#include "deviascope/core/random.h"

#pragma GCC diagnostic push
#pragma GCC diagnostic ignored "-Wpedantic"
#pragma GCC diagnostic ignored "-Wconversion"
#pragma GCC diagnostic ignored "-Wsign-conversion"
#include <Random123/philox.h>
#pragma GCC diagnostic pop

#include <boost/random/normal_distribution.hpp>

namespace deviascope {

Stream::Stream(
    std::uint64_t seed, Purpose purpose, std::uint64_t i, std::uint64_t j, std::uint64_t k)
    : key_{seed, static_cast<std::uint64_t>(purpose)}, counter_{i, j, k, 0} {}

void Stream::refill() {
    const r123::Philox4x64::ctr_type counter{
        {counter_[0], counter_[1], counter_[2], counter_[3]}};
    const r123::Philox4x64::key_type key{{key_[0], key_[1]}};
    const auto words = r123::Philox4x64{}(counter, key);
    for (std::size_t word = 0; word < block_.size(); ++word) block_[word] = words[word];
    ++counter_[3];
    used_ = 0;
}

double uniform(Stream& stream) {
    constexpr double two_to_minus_53 = 1.0 / 9007199254740992.0;
    return static_cast<double>(stream() >> 11U) * two_to_minus_53;
}

double normal(Stream& stream) {
    return boost::random::normal_distribution<double>{}(stream);
}

}  // namespace deviascope
