// SPDX-License-Identifier: GPL-2.0-or-later
#include "deviascope/chain/fingerprint.h"

#include <map>

#include "deviascope/core/digest.h"

namespace deviascope {

std::string fingerprint_of(const Provenance& provenance) {
    Digest digest;
    // Each part by its own digest: parts cannot run into each other.
    digest.add(digest_of(provenance.job_text));
    // Companions come in the order in which they were read, which is not the same everywhere.
    std::map<std::string, std::string> companions;
    for (const Companion& companion : provenance.companions)
        companions[companion.name] = companion.text;
    for (const auto& [name, text] : companions) {
        digest.add(digest_of(name));
        digest.add(digest_of(text));
    }
    for (const InputDigest& input : provenance.inputs) digest.add(input.sha256);
    return digest.hex();
}

}  // namespace deviascope
