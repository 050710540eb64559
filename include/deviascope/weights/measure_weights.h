// SPDX-License-Identifier: GPL-2.0-or-later
// counts -> WEIGHTS -> model
#pragma once

#include <cstdint>
#include <map>
#include <optional>
#include <string>
#include <vector>

#include "deviascope/core/progress.h"
#include "deviascope/counts/survey_input.h"
#include "deviascope/sky/pixelisation.h"
#include "deviascope/weights/measured_weights.h"

namespace deviascope {

/// Spectral index alpha of sources that have no value of their own, S ~ nu^-alpha.
struct SpectralIndex {
    double mean = 0.0;
    double sd = 0.0;  ///< from source to source
};

/// Gaussian measurement error of a property, one standard deviation.
struct PropertyError {
    double amount = 0.0;            ///< flux: a fraction; else in the column's unit
    bool times_one_plus_z = false;  ///< redshift: amount (1 + z)
};

/// What is known of a survey's sources besides their columns.
struct SourcePhysics {
    std::optional<SpectralIndex> alpha;
    std::map<std::string, PropertyError> scatter;  ///< property -> error
};

struct WeighOptions {
    std::uint64_t seed = 0;
    std::uint64_t survey = 0;  ///< number of the survey in the job
    int threads = 1;           ///< never changes a bit
    /// Bootstrap replicates; raised to four a bin, so that their covariance is sound. 200: a
    /// standard deviation is then known to 5 %.
    int replicates = 200;
    double experiment_speed = 0.0;  ///< of the full-sky experiment, units of c; 0: none
    Progress progress;
};

/// Measures the kinematic weights of bins from the survey's own catalogue.
///
///   B = 2 + d ln N / d ln delta at delta = 1
///
/// where N(delta) is the number of sources that lie in the bin once the properties of every
/// source are moved by a boost (sky/boost.h), and 2 comes from the solid angle. In ln S, m,
/// ln(1+z) and ln s the boost is a displacement, so that dN / d ln delta is, at each edge of
/// the bin's and the survey's `select`, the density of sources there times the speed of the
/// displacement (DEVELOPERS.md, Derivations 2). Densities: local likelihood (weights/
/// density_fit.h), from both sides of an edge, from the inside alone where the catalogue ends.
/// Sources are judged by the sky cuts of `count_survey`; one that is in another bin counts by
/// the ratio of the two bins' exposures at its place. Covariance: Poisson bootstrap over
/// sources.
///
/// Spectral index, where an edge of flux or magnitude needs one: the source's own (column
/// `alpha`), else `physics.alpha`: its mean in the estimate, drawn for each source (stream
/// (seed, spectral_index; source, survey, 0)) in the replicates.
/// @param bins  to measure: indices into survey.bins, ascending, each with `select`
/// @return weights in the order of `bins`
/// Errors: UsageError without spectral index; InputError: positions as count_survey; a spectral
/// index that is missing; a bin or an edge without enough sources; a weight whose standard
/// deviation is above 1; what `progress` throws. Memory: one chunk, maps, 0.6 MB an edge.
/// Threads: main thread only.
MeasuredWeights measure_weights(const SurveyInput& survey,
                                const SourcePhysics& physics,
                                const std::vector<std::size_t>& bins,
                                const Pixelisation& grid,
                                Frame frame,
                                const WeighOptions& options);

}  // namespace deviascope
