// SPDX-License-Identifier: GPL-2.0-or-later
#include "app/stored_chain.h"

#include <fmt/format.h>

#include <algorithm>

#include "deviascope/core/error.h"

namespace deviascope {

namespace {

/// Names of the inputs whose bytes are others; every input is named by the job's text.
std::vector<std::string> changed_inputs(const Provenance& stored, const Provenance& own) {
    std::vector<std::string> changed;
    for (const InputDigest& input : own.inputs) {
        const bool is_same = std::any_of(
            stored.inputs.begin(), stored.inputs.end(), [&](const InputDigest& other) {
                return other.path == input.path && other.sha256 == input.sha256;
            });
        if (!is_same) changed.push_back(input.path);
    }
    return changed;
}

/// Names of the prior and weights files whose text is another.
std::vector<std::string> changed_companions(const Provenance& stored, const Provenance& own) {
    std::vector<std::string> changed;
    for (const Companion& companion : own.companions) {
        const bool is_same = std::any_of(
            stored.companions.begin(), stored.companions.end(), [&](const Companion& other) {
                return other.name == companion.name && other.text == companion.text;
            });
        if (!is_same) changed.push_back(companion.name);
    }
    return changed;
}

/// Everything that would make the rest of the chain another than the first part of it.
std::vector<std::string> differences(const Provenance& stored, const Provenance& own) {
    if (stored.job_text != own.job_text) return {"another job text"};
    std::vector<std::string> found;
    if (stored.seed != own.seed)
        found.push_back(fmt::format("seed {} instead of {}", stored.seed, own.seed));
    for (const std::string& name : changed_inputs(stored, own))
        found.push_back("other bytes of " + name);
    for (const std::string& name : changed_companions(stored, own))
        found.push_back("another text of " + name);
    if (stored.version != own.version)
        found.push_back(fmt::format(
            "version {} of the program instead of {}", stored.version, own.version));
    return found;
}

void require_same_job(const ChainLock& lock, const Provenance& stored, const Provenance& own) {
    const auto found = differences(stored, own);
    if (found.empty()) return;
    throw UsageError({lock.chain().string(),
                      fmt::format("was made from {}", fmt::join(found, ", ")),
                      "--resume goes on with the same job, seed, inputs and version only",
                      "restore them, give --replace to start anew, or another folder with -o"});
}

Progressed progress_of(const Chain& chain) {
    const bool is_over = chain.outcome.end == Outcome::End::converged ||
                         chain.outcome.end == Outcome::End::max_steps;
    if (is_over) return Progressed::finished;
    return chain.draws.n_rows > 0 ? Progressed::storing : Progressed::in_warm_up;
}

}  // namespace

StoredChain find_stored_chain(const ChainLock& lock,
                              const Provenance& own,
                              Terminal& terminal) {
    StoredChain found;
    if (!std::filesystem::exists(lock.chain())) return found;
    found.chain = read_chain(lock.chain());
    const Provenance& stored = found.chain.provenance;
    require_same_job(lock, stored, own);
    found.progressed = progress_of(found.chain);
    if (found.progressed == Progressed::storing && stored.libraries != library_versions())
        terminal.warn(
            fmt::format("{}: was begun with other libraries ({}); the rest may differ from an "
                        "uninterrupted run in the last digits",
                        lock.chain().string(),
                        stored.libraries));
    return found;
}

}  // namespace deviascope
