// SPDX-License-Identifier: GPL-2.0-or-later
// ensemble -> CHAIN -> summary
#pragma once

#include <string>

#include "deviascope/chain/chain.h"

namespace deviascope {

/// SHA-256 over the text of the job and the digests of its inputs and companions: results with
/// one fingerprint were made from the same bytes.
std::string fingerprint_of(const Provenance& provenance);

}  // namespace deviascope
