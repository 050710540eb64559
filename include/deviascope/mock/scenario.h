// SPDX-License-Identifier: GPL-2.0-or-later
// MOCK: beside the flow; skies with known truth
#pragma once

#include <Eigen/Core>
#include <filesystem>
#include <optional>
#include <string>
#include <variant>
#include <vector>

#include "deviascope/sky/exclusion.h"
#include "deviascope/sky/frame.h"

namespace deviascope {

/// N(>S) ~ S^-slope from `minimum` on.
struct PowerLawFlux {
    double minimum = 1.0, slope = 1.0;
};
/// N(>S) ~ S^-faint_slope below `break_flux`, S^-bright_slope above, continuous.
struct BrokenPowerLawFlux {
    double minimum = 1.0, break_flux = 10.0, faint_slope = 1.0, bright_slope = 2.0;
};
/// Cumulative p(<z) = 1 - (1 + t) e^-t, t = (z / scale)^power (Gamma(2) in t).
struct RedshiftDistribution {
    double scale = 0.9, power = 1.5;
};
/// N(<m) ~ 10^(slope m) up to `limit`.
struct MagnitudeDistribution {
    double slope = 0.5, limit = 22.0;
};
/// Log-normal angular size.
struct SizeDistribution {
    double median = 2.0, sd_ln = 0.6;
};
/// Spectral index alpha, S ~ nu^-alpha.
struct SpectralIndexDistribution {
    double mean = 0.75, sd = 0.0;
};

/// Gaussian measurement scatter, applied after the boost.
struct MeasurementScatter {
    double flux = 0.0;       ///< fraction of the flux
    double magnitude = 0.0;  ///< magnitudes
    double redshift = 0.0;   ///< times (1 + z)
    double size = 0.0;       ///< fraction of the size
};

/// A survey of an invented sky, in the frame of its sources until the boost.
struct MockSurvey {
    std::string name;
    double sources = 0.0;  ///< mean number drawn over the full sky before boost, cuts and mask
    Eigen::Vector3d intrinsic =
        Eigen::Vector3d::Zero();  ///< dipole of the density, scenario frame
    std::optional<std::variant<PowerLawFlux, BrokenPowerLawFlux>> flux;
    std::optional<RedshiftDistribution> redshift;
    std::optional<MagnitudeDistribution> magnitude;
    std::optional<SizeDistribution> size;
    SpectralIndexDistribution alpha;
    MeasurementScatter scatter;
    double extra_components = 0.0;  ///< each source becomes 1 + Poisson(this) catalogue rows
    std::vector<Exclusion> exclude;
    std::optional<std::filesystem::path>
        exposure;  ///< HEALPix map 0 … 1: sources are thinned by it
    // further fields (cuts on observed properties, output file and format, column names, frame
    // of the catalogue) are the mock stage's own
};

/// A mock sky: observer's velocity and surveys.
struct Scenario {
    std::uint64_t seed = 0;
    Frame frame = Frame::galactic;                       ///< of velocity and intrinsic
    Eigen::Vector3d velocity = Eigen::Vector3d::Zero();  ///< units of c
    std::vector<MockSurvey> surveys;
};

}  // namespace deviascope
