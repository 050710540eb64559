// SPDX-License-Identifier: GPL-2.0-or-later
// CORE, private: several numbers worked on side by side
#pragma once

#include <cstddef>

namespace deviascope {

/// Numbers that one instruction works on where the processor can: operations act on each lane
/// alone, so that the bits of a lane do not depend on its neighbours or on the instruction set.
inline constexpr std::size_t n_lanes = 8;
using Lanes [[gnu::vector_size(n_lanes * sizeof(double)), gnu::aligned(64)]] = double;

}  // namespace deviascope

// Marks a function to be compiled for several instruction sets; the widest that the processor
// has is chosen when the program starts. All give the same bits as long as the function holds
// elementary operations only (the library is built with -ffp-contract=off); what it calls must
// be always_inline. A macro, because an attribute cannot be named otherwise. Put it on
// functions without an earlier declaration: clang passes over it there.
#if defined(__x86_64__) && defined(__has_attribute) && !defined(DEVIASCOPE_ONE_INSTRUCTION_SET)
#if __has_attribute(target_clones)
#define DEVIASCOPE_WIDEST_INSTRUCTIONS \
    __attribute__((target_clones("default", "avx2", "arch=x86-64-v4")))
#endif
#endif
#ifndef DEVIASCOPE_WIDEST_INSTRUCTIONS
#define DEVIASCOPE_WIDEST_INSTRUCTIONS
#endif
