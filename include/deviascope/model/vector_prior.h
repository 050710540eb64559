// SPDX-License-Identifier: GPL-2.0-or-later
// counts -> MODEL -> ensemble
#pragma once

#include <Eigen/Core>
#include <cstdint>
#include <string>
#include <variant>

#include "deviascope/core/random.h"
#include "deviascope/sky/direction.h"
#include "deviascope/sky/frame.h"

namespace deviascope {

/// Constant density inside the ball |v| < max, 0 < max <= 1.
struct UniformVectorPrior {
    double max = 0.0;
    bool operator==(const UniformVectorPrior&) const = default;
};
/// Uniform in amplitude 0 … max, isotropic in direction: density 1 / (4 pi max |v|^2);
/// 0 < max <= 1.
struct UniformAmplitudePrior {
    double max = 0.0;
    bool operator==(const UniformAmplitudePrior&) const = default;
};
/// Gaussian in the vector. Covariance symmetric positive definite; |mean| < 1.
struct GaussianPrior {
    Eigen::Vector3d mean = Eigen::Vector3d::Zero();
    Eigen::Matrix3d covariance = Eigen::Matrix3d::Identity();
    bool operator==(const GaussianPrior&) const = default;
};
/// Along a fixed direction (in the job's frame), amplitude uniform in 0 … max, 0 < max <= 1.
struct AxisPrior {
    Direction axis = Direction::UnitZ();
    double max = 0.0;
    bool operator==(const AxisPrior&) const = default;
};
/// Not sampled; |value| < 1.
struct FixedPrior {
    Eigen::Vector3d value = Eigen::Vector3d::Zero();
    bool operator==(const FixedPrior&) const = default;
};

/// A measured speed and direction, as published.
struct MeasuredVelocity {
    double speed_km_s = 0.0, speed_sd_km_s = 0.0;
    double lon_deg = 0.0;
    double lon_sd_deg = 0.0;  ///< a coordinate error: times cos lat on the sky
    double lat_deg = 0.0, lat_sd_deg = 0.0;
    Frame frame = Frame::galactic;
};

/// The Gaussian in the vector, units of c, in `job_frame`: mean along the direction with length
/// speed / c, standard deviations speed_sd / c radially, (speed / c) cos(lat) lon_sd along lon
/// and (speed / c) lat_sd along lat, rotated. Source: linear propagation of the published
/// errors (derived in DEVELOPERS.md).
GaussianPrior gaussian_of(const MeasuredVelocity& measured, Frame job_frame);

/// The prior of one vector (velocity or intrinsic dipole), in the job's frame, in the vector's
/// unit.
///
/// Every density has |v| < 1 as a hard wall (log density -inf outside).
/// The sampler moves *coordinates* (DEVELOPERS.md): the vector itself, except
///   uniform-amplitude: u with v = u |u|^2 / max^2, flat in the ball |u| < max;
///   axis: one coordinate, the amplitude;   fixed: none.
class VectorPrior {
  public:
    using Kind = std::variant<UniformVectorPrior,
                              UniformAmplitudePrior,
                              GaussianPrior,
                              AxisPrior,
                              FixedPrior>;

    /// @param name  file name, or the kind of an inline table
    /// Errors: UsageError (all faults) where a number of the kind is outside its range above.
    VectorPrior(std::string name, Kind kind);

    const std::string& name() const { return name_; }
    const Kind& kind() const { return kind_; }
    /// The same density (its name may differ).
    bool operator==(const VectorPrior& other) const { return kind_ == other.kind_; }
    std::string kind_name() const;       ///< `uniform-vector`, …
    Eigen::Index n_coordinates() const;  ///< 3, 1 or 0

    /// The vector at given coordinates (n_coordinates).
    Eigen::Vector3d vector_at(const Eigen::Ref<const Eigen::VectorXd>& coordinates) const;
    /// Coordinates of a vector; for `axis` its component along the axis.
    Eigen::VectorXd coordinates_of(const Eigen::Vector3d& vector) const;
    /// d vector / d coordinates, 3 x n_coordinates. Uniform-amplitude:
    /// (|u|^2 I + 2 u u^T) / max^2, determinant 3 |u|^6 / max^6.
    Eigen::MatrixXd jacobian_at(const Eigen::Ref<const Eigen::VectorXd>& coordinates) const;

    /// Normalised log density **in the coordinates**; -inf outside the support or the wall.
    /// (The cut of a Gaussian by the wall |v| < 1 is not renormalised.)
    double log_density(const Eigen::Ref<const Eigen::VectorXd>& coordinates) const;

    /// One draw of the vector; a Gaussian is drawn again where it lies outside the wall.
    /// Errors: NumericalError where 10^6 draws of a Gaussian all lie outside.
    Eigen::Vector3d draw(Stream& stream) const;

    /// Radius of the support about 0: max, and 1 for a Gaussian; the length of a fixed vector.
    double furthest() const;

    /// Median of |v| under the prior: exact where closed (max / cbrt 2, max / 2, fixed,
    /// isotropic Gaussian of mean 0: Maxwell's distribution cut at the wall), else the median
    /// of 100,000 keyed draws of (seed, prior_draw; 0, draw, 0).
    double median_amplitude(std::uint64_t seed) const;

    /// Covariance of the vector as the separation of the summary counts it:
    /// uniform-vector max^2/5, uniform-amplitude max^2/9 a component, gaussian its own, axis
    /// max^2/12 along the axis, fixed 0.
    Eigen::Matrix3d covariance() const;

  private:
    std::string name_;
    Kind kind_;
    Eigen::Matrix3d factor_ = Eigen::Matrix3d::Zero();  ///< Cholesky, lower (gaussian)
    Eigen::Matrix3d precision_factor_ = Eigen::Matrix3d::Zero();  ///< its inverse
    double log_normalisation_ = 0.0;
};

}  // namespace deviascope
