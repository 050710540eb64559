// SPDX-License-Identifier: GPL-2.0-or-later
// MOCK: beside the flow; skies with known truth
#pragma once

#include <Eigen/Core>
#include <array>
#include <cstdint>
#include <filesystem>
#include <limits>
#include <optional>
#include <string>
#include <string_view>
#include <variant>
#include <vector>

#include "deviascope/core/error.h"
#include "deviascope/mock/population.h"
#include "deviascope/sky/exclusion.h"
#include "deviascope/sky/frame.h"

namespace deviascope {

/// What is known of a source besides its position, in the order in which it is drawn.
enum class Property : std::size_t { alpha, flux, redshift, magnitude, size };
inline constexpr std::size_t n_properties = 5;
using PropertyValues = std::array<double, n_properties>;

/// `alpha`, `flux`, `redshift`, `magnitude`, `size`: the spelling of job and scenario files.
std::string name_of(Property property);
std::optional<Property> property_of_name(std::string_view name);
const std::vector<std::string>& property_names();

/// Gaussian measurement scatter, applied after the boost. A measured value may fall outside
/// what is physical (a negative flux); `keep` decides whether it enters the catalogue.
struct MeasurementScatter {
    double flux = 0.0;       ///< fraction of the flux
    double redshift = 0.0;   ///< times (1 + z)
    double magnitude = 0.0;  ///< magnitudes
    double size = 0.0;       ///< fraction of the size
};

/// Half-open range [low, high) of a measured property; infinities allowed.
struct KeptRange {
    Property property = Property::flux;
    double low = -std::numeric_limits<double>::infinity();
    double high = std::numeric_limits<double>::infinity();
};

/// Thinning by a HEALPix map 0 … 1 read from a file, at the source's own position in the map's
/// own resolution; absent values are 0.
struct ExposureFile {
    std::filesystem::path path;
    std::optional<Frame> map_frame;  ///< only where the map carries no COORDSYS
};

/// Thinning by a map made here and written beside the catalogue, RING order, in `frame`: at
/// pixel centres 1 - (1 - lowest) (1 + n.a) / 2, which is `lowest` towards a and 1 opposite.
struct ExposureGradient {
    std::string file;  ///< name of the map's file; empty: `<survey>-exposure.fits`
    int nside = 64;
    double lowest = 1.0;                   ///< 0 … 1
    double lon_deg = 0.0, lat_deg = 90.0;  ///< of a, in `frame`
    Frame frame = Frame::icrs;
};

using MockExposure = std::variant<ExposureFile, ExposureGradient>;

/// A column of the catalogue that is written.
struct PropertyColumn {
    Property property = Property::flux;
    std::string name;
};

/// How a survey's catalogue is written.
struct CatalogueOutput {
    std::string file;  ///< name ending in .fits or .csv; empty: `<survey>.fits`
    Frame frame = Frame::icrs;
    std::string lon_column;  ///< empty: RA, GLON or ELON after the frame
    std::string lat_column;  ///< empty: DEC, GLAT or ELAT
    std::optional<std::vector<PropertyColumn>> columns;  ///< absent: every property drawn
    bool single_precision = false;      ///< of the properties; positions are double
    std::string extension = "SOURCES";  ///< EXTNAME of the FITS table
};

/// A survey of an invented sky, in the frame of its sources until the boost. Properties are
/// drawn independently of one another and of the direction.
struct MockSurvey {
    std::string name;      ///< [a-z0-9-]+, not "all"
    double sources = 0.0;  ///< mean number drawn over the full sky before boost, cuts and mask
    Eigen::Vector3d intrinsic =
        Eigen::Vector3d::Zero();  ///< dipole of the density, scenario frame, length below 1
    SpectralIndexDistribution alpha;
    std::optional<FluxDistribution> flux;
    std::optional<RedshiftDistribution> redshift;
    std::optional<MagnitudeDistribution> magnitude;
    std::optional<SizeDistribution> size;
    MeasurementScatter scatter;
    double extra_components = 0.0;  ///< each source becomes 1 + Poisson(this) catalogue rows
    std::vector<KeptRange> keep;    ///< on measured properties, all must hold
    std::vector<Exclusion> exclude;
    std::optional<MockExposure> exposure;
    CatalogueOutput output;

    /// Whether sources of this survey have a property (alpha: always).
    bool has(Property property) const;
    /// The range of a property, unbounded where `keep` does not name it.
    KeptRange kept_range(Property property) const;
    /// Scatter of a property; 0 for alpha.
    double scatter_of(Property property) const;
    std::string catalogue_file() const;
    /// Names of the position columns, and the property columns that are written, in order.
    std::string lon_column() const;
    std::string lat_column() const;
    std::vector<PropertyColumn> property_columns() const;
    /// Name of the map written for an ExposureGradient.
    std::string exposure_file() const;
};

/// A mock sky: observer's velocity and surveys.
struct Scenario {
    std::string title;
    std::uint64_t seed = 0;                              ///< 0 … 2^63-1
    Frame frame = Frame::galactic;                       ///< of velocity and intrinsic
    Eigen::Vector3d velocity = Eigen::Vector3d::Zero();  ///< units of c, length below 1
    std::vector<MockSurvey> surveys;

    /// Every violated rule, with value, what is allowed and what to do; empty where all is
    /// well. Among them: the faintest sources drawn must stay outside the kept range for every
    /// direction and 6 standard deviations of alpha and scatter, so that sources cross the
    /// catalogue's limit both ways.
    std::vector<Message> problems() const;
    /// What a user should know though the sky can be made.
    std::vector<std::string> warnings() const;
};

}  // namespace deviascope
