// SPDX-License-Identifier: GPL-2.0-or-later
// ensemble -> CHAIN -> summary (private): words of chains.h5 that writer and reader share
#pragma once

#include <array>
#include <string>
#include <utility>

#include "core/h5/identity.h"
#include "deviascope/chain/chain.h"

namespace deviascope::chain_layout {

const h5::Identity& identity();

inline constexpr std::array<std::pair<Role, const char*>, 3> roles{
    {{Role::sampled, "sampled"}, {Role::constant, "constant"}, {Role::redrawn, "redrawn"}}};

inline constexpr std::array<std::pair<Outcome::End, const char*>, 4> ends{
    {{Outcome::End::not_run, "unfinished"},
     {Outcome::End::converged, "converged"},
     {Outcome::End::max_steps, "max_steps"},
     {Outcome::End::interrupted, "interrupted"}}};

/// The word of the file for a value of an enumeration.
template <class Value, std::size_t n>
const char* word_for(const std::array<std::pair<Value, const char*>, n>& words, Value value) {
    for (const auto& [candidate, word] : words)
        if (candidate == value) return word;
    ensure(false, "each value of an enumeration has a word in the file");
    return "";
}

/// Names of the kernels in the order of a KernelTally.
std::array<std::string, n_kernels> kernel_names();

}  // namespace deviascope::chain_layout
