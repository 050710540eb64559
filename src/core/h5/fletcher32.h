// SPDX-License-Identifier: GPL-2.0-or-later
// CORE (private to this folder): the checksum of HDF5 chunks
#pragma once

#include <cstdint>
#include <span>

namespace deviascope::h5 {

/// Fletcher's checksum as the HDF5 library stores it behind a chunk (filter 3): of big-endian
/// words of 16 bits, both sums modulo 65535, where a sum that is not 0 ends as 65535.
/// @param bytes  an even number of them
/// Source: Fletcher 1982, IEEE Trans. Commun. 30, 247; HDF5 File Format Specification 3.0.
/// The sums are the same for words of either byte order but for the order of their own two
/// bytes (RFC 1071), and are made in sixteen lanes: with n words of which lane k has every
/// sixteenth from k on, and sums a_k and b_k of its own, b = sum_k (16 b_k - k a_k).
std::uint32_t fletcher32(std::span<const char> bytes);

}  // namespace deviascope::h5
