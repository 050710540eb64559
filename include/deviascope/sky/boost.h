// SPDX-License-Identifier: GPL-2.0-or-later
// SKY: where things are, no sources
#pragma once

#include <Eigen/Core>
#include <cmath>

#include "deviascope/sky/direction.h"

namespace deviascope {

/// What an observer who moves with velocity beta (units of c, |beta| < 1) sees of a source that
/// lies at n for an observer at rest. Exact in beta; special relativity only.
///
///   gamma = (1 - beta^2)^(-1/2)
///   delta = nu' / nu = gamma (1 + beta.n)                                  Doppler factor
///   n'    = [ n + (gamma + gamma^2/(gamma+1) beta.n) beta ] / delta        aberration
///
/// n' is the spatial part of the Lorentz boost of the photon's four-momentum; since
/// gamma^2/(gamma+1) = (gamma-1)/beta^2 it needs no unit vector and holds at beta = 0.
/// Source: any text on special relativity, for instance Einstein 1905, Annalen der Physik 322,
/// 891, section 7.
class Boost {
  public:
    /// @param beta  velocity, units of c. Domain: |beta| < 1 (callers check input).
    explicit Boost(const Eigen::Vector3d& beta)
        : beta_(beta),
          gamma_(1.0 / std::sqrt((1.0 - beta.norm()) * (1.0 + beta.norm()))),
          bend_(gamma_ * gamma_ / (gamma_ + 1.0)) {}

    double gamma() const { return gamma_; }

    /// delta of a source at n (unit vector) in the frame at rest.
    double doppler_factor(const Direction& n) const { return gamma_ * (1.0 + beta_.dot(n)); }

    /// n' of a source at n; unit to rounding.
    Direction aberrated(const Direction& n) const {
        const double along = beta_.dot(n);
        return (n + (gamma_ + bend_ * along) * beta_) / (gamma_ * (1.0 + along));
    }

  private:
    Eigen::Vector3d beta_;
    double gamma_;
    double bend_;
};

/// Flux density at a fixed observed frequency of a point source with S ~ nu^-alpha:
/// S' = S delta^(1+alpha), from the invariance of I_nu / nu^3 and dOmega' = dOmega / delta^2.
/// alpha = 1 gives the bolometric flux, alpha = 0 the photon rate.
inline double boosted_flux(double flux, double alpha, double delta) {
    return flux * std::pow(delta, 1.0 + alpha);
}

/// m' = m - 2.5 (1 + alpha) log10 delta; alpha = 1 for a bolometric magnitude.
inline double boosted_magnitude(double magnitude, double alpha, double delta) {
    return magnitude - 2.5 * (1.0 + alpha) * std::log10(delta);
}

/// 1 + z' = (1 + z) / delta.
inline double boosted_redshift(double redshift, double delta) {
    return (1.0 + redshift) / delta - 1.0;
}

/// A small angle: s' = s / delta (aberration is conformal).
inline double boosted_size(double size, double delta) {
    return size / delta;
}

}  // namespace deviascope
