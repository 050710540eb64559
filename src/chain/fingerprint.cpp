// SPDX-License-Identifier: GPL-2.0-or-later
#include "deviascope/chain/fingerprint.h"

#include "deviascope/core/digest.h"

namespace deviascope {

std::string fingerprint_of(const Provenance& provenance) {
    Digest digest;
    // Each part by its own digest: parts cannot run into each other.
    digest.add(digest_of(provenance.job_text));
    for (const Companion& companion : provenance.companions) {
        digest.add(digest_of(companion.name));
        digest.add(digest_of(companion.text));
    }
    for (const InputDigest& input : provenance.inputs) digest.add(input.sha256);
    return digest.hex();
}

}  // namespace deviascope
