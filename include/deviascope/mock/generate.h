// SPDX-License-Identifier: GPL-2.0-or-later
// MOCK: beside the flow; skies with known truth
#pragma once

#include <array>
#include <cstdint>
#include <functional>
#include <vector>

#include "deviascope/core/progress.h"
#include "deviascope/mock/scenario.h"
#include "deviascope/sky/direction.h"

namespace deviascope {

/// Rows of a mock catalogue, in the order of the sources.
struct MockRows {
    std::vector<Direction> position;  ///< as observed, in the survey's output frame
    /// Measured values, indexed by Property; empty where the survey has no such property.
    std::array<std::vector<double>, n_properties> property;

    const std::vector<double>& of(Property which) const {
        return property[static_cast<std::size_t>(which)];
    }
    std::size_t size() const { return position.size(); }
    void clear();
};

/// What became of the sources; the lines add up:
///   drawn = outside_kept_range + sum of excluded + thinned + kept.
struct MockTally {
    std::int64_t drawn = 0;               ///< sources over the full sky
    std::int64_t outside_kept_range = 0;  ///< removed by `keep`
    std::vector<std::int64_t> excluded;   ///< removed by each exclusion, in order
    std::int64_t thinned = 0;             ///< removed by the exposure
    std::int64_t kept = 0;                ///< sources in the catalogue
    std::int64_t rows = 0;                ///< rows in the catalogue, components counted
    bool finished = true;                 ///< false where `stop_requested` ended it early

    void add(const MockTally& other);
};

struct MockOptions {
    int threads = 1;                       ///< never changes a bit of the result
    std::function<bool()> stop_requested;  ///< asked between batches; empty: never
    Progress progress;
};

using MockSink = std::function<void(const MockRows&)>;

/// Draws one survey of a scenario and hands its rows, in order and in pieces of bounded size,
/// to `sink` (called from the calling thread only).
///
/// By physical forward simulation, never by the fitted formula:
/// 1. the number of sources is Poisson with mean `sources`, stream (seed, mock_population;
///    0, survey, 0);
/// 2. source i has stream (seed, mock_source; i, survey, 0) and draws from it in this order,
///    leaving out what the survey does not have: cosine of the angle to the intrinsic dipole;
///    azimuth about it; alpha (normal); flux (uniform); redshift (two uniforms); magnitude
///    (uniform); size (normal); then
/// 3. it is aberrated and its properties are Doppler shifted (sky/boost.h); scatter is drawn for
///    flux, redshift, magnitude, size (normals); values are rounded to single precision where
///    the catalogue is;
/// 4. `keep` and the exclusions are judged, the latter at the source's own observed position;
///    the exposure map's pixel there against a uniform; components (Poisson).
///
/// @param survey  position in scenario.surveys
/// Errors: UsageError with scenario.problems(); InputError for an exposure map.
MockTally draw_survey(const Scenario& scenario,
                      std::size_t survey,
                      const MockOptions& options,
                      const MockSink& sink);

/// The whole survey in memory.
MockRows draw_survey_rows(const Scenario& scenario, std::size_t survey, int threads = 1);

}  // namespace deviascope
