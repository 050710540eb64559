// SPDX-License-Identifier: GPL-2.0-or-later
// Whether two chains, or parts of them, are the same bit for bit.
#pragma once

#include <algorithm>
#include <optional>

#include "deviascope/chain/chain.h"
#include "file_bytes.h"

namespace deviascope::test {

inline bool same(const CutReport& a, const CutReport& b) {
    const auto same_line = [](const CutLine& one, const CutLine& other) {
        return one.name == other.name && one.rows_removed == other.rows_removed &&
               one.pixels_removed == other.pixels_removed;
    };
    return a.rows_read == b.rows_read && a.rows_kept == b.rows_kept &&
           a.pixels_total == b.pixels_total && a.pixels_kept == b.pixels_kept &&
           a.warnings == b.warnings &&
           std::equal(a.cuts.begin(), a.cuts.end(), b.cuts.begin(), b.cuts.end(), same_line);
}

inline bool same(const SurveyCounts& a, const SurveyCounts& b) {
    const auto same_footprint = [](const Footprint& one, const Footprint& other) {
        return one.pixel == other.pixel && same_bits(one.exposure, other.exposure);
    };
    const auto same_bin = [](const BinCounts& one, const BinCounts& other) {
        return one.name == other.name && one.footprint == other.footprint &&
               one.count == other.count;
    };
    return a.name == b.name && same(a.cuts, b.cuts) &&
           std::equal(a.footprints.begin(),
                      a.footprints.end(),
                      b.footprints.begin(),
                      b.footprints.end(),
                      same_footprint) &&
           std::equal(a.bins.begin(), a.bins.end(), b.bins.begin(), b.bins.end(), same_bin);
}

inline bool same(const Counts& a, const Counts& b) {
    const auto same_survey = [](const SurveyCounts& one, const SurveyCounts& other) {
        return same(one, other);
    };
    return a.nside == b.nside && a.frame == b.frame &&
           std::equal(a.surveys.begin(),
                      a.surveys.end(),
                      b.surveys.begin(),
                      b.surveys.end(),
                      same_survey);
}

inline bool same(const Draws& a, const Draws& b) {
    return a.n_rows == b.n_rows && a.n_replicates == b.n_replicates &&
           a.n_walkers == b.n_walkers && a.n_parameters == b.n_parameters &&
           same_bits(a.value, b.value) && same_bits(a.log_posterior, b.log_posterior) &&
           same_bits(a.log_likelihood, b.log_likelihood);
}

inline bool same(const std::optional<CoordinateGaussian>& a,
                 const std::optional<CoordinateGaussian>& b) {
    if (!a || !b) return !a && !b;
    return a->mean == b->mean && a->factor == b->factor;
}

inline bool same(const WarmUp& a, const WarmUp& b) {
    return same(a.buffer, b.buffer) && a.step == b.step && a.settled == b.settled &&
           a.discarded == b.discarded && a.store_every == b.store_every &&
           same(a.approximation, b.approximation) && a.warnings == b.warnings;
}

inline bool same(const KernelTally& a, const KernelTally& b) {
    return a.tried == b.tried && a.taken == b.taken;
}

inline bool same(const EnsembleState& a, const EnsembleState& b) {
    return a.step == b.step && a.look == b.look && same(a.tally, b.tally) &&
           same_bits(a.coordinates, b.coordinates) &&
           same_bits(a.log_posterior, b.log_posterior) &&
           same_bits(a.log_likelihood, b.log_likelihood) && a.evaluations == b.evaluations;
}

inline bool same(const Outcome& a, const Outcome& b) {
    return a.end == b.end && a.steps == b.steps && a.discarded == b.discarded &&
           a.store_every == b.store_every && a.n_rows == b.n_rows &&
           a.warm_up_settled == b.warm_up_settled && same(a.tally, b.tally);
}

inline bool same(const Provenance& a, const Provenance& b) {
    const auto same_input = [](const InputDigest& one, const InputDigest& other) {
        return one.path == other.path && one.sha256 == other.sha256 && one.bytes == other.bytes;
    };
    const auto same_companion = [](const Companion& one, const Companion& other) {
        return one.name == other.name && one.path == other.path && one.text == other.text;
    };
    return a.job_name == b.job_name && a.job_text == b.job_text && a.version == b.version &&
           a.libraries == b.libraries && a.seed == b.seed && a.started == b.started &&
           a.ended == b.ended &&
           std::equal(a.inputs.begin(),
                      a.inputs.end(),
                      b.inputs.begin(),
                      b.inputs.end(),
                      same_input) &&
           std::equal(a.companions.begin(),
                      a.companions.end(),
                      b.companions.begin(),
                      b.companions.end(),
                      same_companion);
}

inline bool same(const std::vector<Parameter>& a, const std::vector<Parameter>& b) {
    const auto same_parameter = [](const Parameter& one, const Parameter& other) {
        return one.name == other.name && one.unit == other.unit &&
               one.meaning == other.meaning && one.role == other.role;
    };
    return std::equal(a.begin(), a.end(), b.begin(), b.end(), same_parameter);
}

inline bool same(const std::vector<VectorParameter>& a, const std::vector<VectorParameter>& b) {
    const auto same_vector = [](const VectorParameter& one, const VectorParameter& other) {
        return one.name == other.name && one.first == other.first &&
               one.amplitude_free == other.amplitude_free &&
               one.direction_free == other.direction_free;
    };
    return std::equal(a.begin(), a.end(), b.begin(), b.end(), same_vector);
}

/// Of the options, what is stored.
inline bool same(const EnsembleOptions& a, const EnsembleOptions& b) {
    return a.seed == b.seed && a.replicates == b.replicates && a.walkers == b.walkers &&
           a.effective_draws == b.effective_draws && a.max_steps == b.max_steps &&
           a.store_every == b.store_every && a.kernels.stretch == b.kernels.stretch &&
           a.kernels.differential_evolution == b.kernels.differential_evolution &&
           a.kernels.independence == b.kernels.independence;
}

inline bool same(const Chain& a, const Chain& b) {
    return same(a.provenance, b.provenance) && same(a.options, b.options) &&
           same(a.parameters, b.parameters) && same(a.vectors, b.vectors) &&
           same(a.counts, b.counts) && same(a.warm_up, b.warm_up) && same(a.draws, b.draws) &&
           same(a.state, b.state) && same(a.outcome, b.outcome);
}

}  // namespace deviascope::test
