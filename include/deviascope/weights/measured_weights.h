// SPDX-License-Identifier: GPL-2.0-or-later
// counts -> WEIGHTS -> model
#pragma once

#include <Eigen/Core>
#include <cstdint>
#include <limits>
#include <optional>
#include <string>
#include <vector>

namespace deviascope {

/// How the density of sources at an edge was found.
enum class EdgeMethod {
    central,         ///< from sources on both sides
    one_sided,       ///< from the inside alone: the catalogue ends at the edge or just beyond
    end_of_property  ///< flux or size 0, or redshift 0 with no source beyond: nothing crosses
};
/// `central`, `one-sided`, `end of the property`.
std::string name_of(EdgeMethod method);

/// What is known of one edge of a bin.
struct EdgeReport {
    std::string property;  ///< flux, magnitude, redshift or size
    bool upper = false;    ///< an upper end of the range
    double value = 0.0;    ///< of the edge, in the column's unit
    EdgeMethod method = EdgeMethod::central;
    std::int64_t sources = 0;  ///< in the window, on both sides
    double inside = 0.0;       ///< width of the window inside the bin, in `unit`
    double outside = 0.0;      ///< likewise outside
    std::string unit;          ///< ln S, magnitudes, ln(1+z) or ln s
    double term = 0.0;         ///< what the edge adds to the weight
};

/// The full-sky experiment on one bin.
struct SkyExperiment {
    bool possible = false;  ///< false where the catalogue ends at edges in both directions
    double dipole = 0.0;    ///< found along the velocity
    double expected = 0.0;  ///< from the measured densities, for the same boost
    double sd = 0.0;        ///< of the difference, the weight's own error included
    double pull() const { return (dipole - expected) / sd; }
};

/// The measured weight of one bin.
struct BinReport {
    std::string name;
    double mean = 0.0;
    double sd = 0.0;
    std::int64_t sources = 0;
    std::vector<EdgeReport> edges;
    double with_half_windows = 0.0;   ///< the weight, all windows half as wide
    double with_twice_windows = 0.0;  ///< likewise twice as wide, as far as they reach
    std::optional<SkyExperiment> experiment;
    std::optional<double> scatter_free;  ///< weight of the distribution without scatter
};

/// What measurement scatter means for the velocity, were weights of scatter-free distributions
/// used for a catalogue with scatter: fitted over true velocity.
struct ScatterShift {
    double free_intrinsic = 1.0;  ///< the survey alone, its intrinsic dipole free
    double no_intrinsic = 1.0;    ///< the survey alone, without an intrinsic dipole
    /// Their standard deviations over the bootstrap replicates; NaN with fewer than two.
    double free_intrinsic_sd = std::numeric_limits<double>::quiet_NaN();
    double no_intrinsic_sd = std::numeric_limits<double>::quiet_NaN();
};

/// The measured weights of a survey.
struct MeasuredWeights {
    std::string survey;
    std::vector<BinReport> bins;    ///< those that were measured, in job order
    Eigen::MatrixXd covariance;     ///< bins x bins
    int replicates = 0;             ///< of the bootstrap
    double experiment_speed = 0.0;  ///< of the full-sky experiment, units of c; 0: none
    std::optional<ScatterShift> scatter_shift;
    std::vector<std::string> warnings;
};

}  // namespace deviascope
