// SPDX-License-Identifier: GPL-2.0-or-later
// Densities with known moments, for tests of everything that samples.
#pragma once

#include <Eigen/Cholesky>
#include <Eigen/Core>
#include <cmath>
#include <limits>
#include <numbers>
#include <string>
#include <utility>
#include <vector>

#include "deviascope/core/random.h"
#include "deviascope/core/target.h"

namespace deviascope::test {

/// A target whose parameters are its coordinates, `x0`, `x1` …; derived classes give the log
/// density of one walker and a starting point.
class CoordinateTarget : public Target {
  public:
    explicit CoordinateTarget(Eigen::Index n) : n_(n) {
        for (Eigen::Index axis = 0; axis < n; ++axis)
            parameters_.push_back(
                {"x" + std::to_string(axis), "1", "a coordinate", Role::sampled});
    }

    /// Log density of one walker.
    virtual double log_density_at(const double* x) const = 0;

    const std::vector<Parameter>& parameters() const override { return parameters_; }
    const std::vector<VectorParameter>& vectors() const override { return vectors_; }
    Eigen::Index n_coordinates() const override { return n_; }
    void log_density(const Eigen::Ref<const Eigen::MatrixXd>& coordinates,
                     Eigen::Ref<Eigen::VectorXd> log_posterior,
                     Eigen::Ref<Eigen::VectorXd> log_likelihood) const override {
        for (Eigen::Index walker = 0; walker < coordinates.cols(); ++walker) {
            log_posterior[walker] = log_density_at(coordinates.col(walker).data());
            log_likelihood[walker] = log_posterior[walker];
        }
    }
    void to_parameters(const Eigen::Ref<const Eigen::MatrixXd>& coordinates,
                       Eigen::Ref<Eigen::MatrixXd> parameters) const override {
        parameters.topRows(n_) = coordinates;
    }
    void redraw(std::span<Stream>, Eigen::Ref<Eigen::MatrixXd>) const override {}
    /// Standard normal times 2 in every coordinate.
    void draw_start(Stream& stream, Eigen::Ref<Eigen::VectorXd> coordinates) const override {
        for (double& x : coordinates) x = 2.0 * normal(stream);
    }

  protected:
    std::vector<Parameter> parameters_;
    std::vector<VectorParameter> vectors_;

  private:
    Eigen::Index n_;
};

/// Normal with covariance rho^|i-j|: a chain with tridiagonal precision, O(n) a walker.
/// rho = 0: the unit Gaussian.
class ChainGaussian : public CoordinateTarget {
  public:
    explicit ChainGaussian(Eigen::Index n, double rho = 0.0) : CoordinateTarget(n), rho_(rho) {}
    double log_density_at(const double* x) const override {
        double sum = 0.0;
        for (Eigen::Index axis = 0; axis < n_coordinates(); ++axis) {
            const double step = axis == 0 ? x[0] : x[axis] - rho_ * x[axis - 1];
            sum += axis == 0 ? step * step : step * step / (1.0 - rho_ * rho_);
        }
        return -0.5 * sum;
    }

  private:
    double rho_;
};

/// The same, started from the density itself.
class ExactlyStartedGaussian : public ChainGaussian {
  public:
    using ChainGaussian::ChainGaussian;
    void draw_start(Stream& stream, Eigen::Ref<Eigen::VectorXd> coordinates) const override {
        for (double& x : coordinates) x = normal(stream);
    }
};

/// exp(-(100 (x1 - x0^2)^2 + (1 - x0)^2) / 20), a density Goodman & Weare 2010 use.
/// x0 ~ Normal(1, variance 10), x1 given x0 ~ Normal(x0^2, variance 0.1).
class Rosenbrock : public CoordinateTarget {
  public:
    Rosenbrock() : CoordinateTarget(2) {}
    double log_density_at(const double* x) const override {
        const double bend = x[1] - x[0] * x[0];
        const double offset = 1.0 - x[0];
        return -(100.0 * bend * bend + offset * offset) / 20.0;
    }
    void draw_start(Stream& stream, Eigen::Ref<Eigen::VectorXd> coordinates) const override {
        const double along = normal(stream);
        const double across = normal(stream);
        coordinates[0] = 1.0 + std::sqrt(10.0) * along;
        coordinates[1] = coordinates[0] * coordinates[0] + std::sqrt(0.1) * across;
    }
};

/// Two unit Gaussians of equal weight, this far from each other along the first axis. Walkers
/// start in either lobe, in shares that differ from replicate to replicate only by chance.
class TwoLobes : public CoordinateTarget {
  public:
    TwoLobes(Eigen::Index n, double distance) : CoordinateTarget(n), distance_(distance) {}
    double log_density_at(const double* x) const override {
        double rest = 0.0;
        for (Eigen::Index axis = 1; axis < n_coordinates(); ++axis) rest += x[axis] * x[axis];
        const double left = x[0] + 0.5 * distance_;
        const double right = x[0] - 0.5 * distance_;
        const double a = -0.5 * left * left;
        const double b = -0.5 * right * right;
        return std::max(a, b) + std::log1p(std::exp(-std::abs(a - b))) - 0.5 * rest;
    }
    void draw_start(Stream& stream, Eigen::Ref<Eigen::VectorXd> coordinates) const override {
        const double side = uniform(stream) < 0.5 ? -0.5 : 0.5;
        for (double& x : coordinates) x = normal(stream);
        coordinates[0] += side * distance_;
    }

  private:
    double distance_;
};

/// Uniform in the ball |x| < 1: E |x|^k = n / (n + k).
class UniformBall : public CoordinateTarget {
  public:
    using CoordinateTarget::CoordinateTarget;
    double log_density_at(const double* x) const override {
        double square = 0.0;
        for (Eigen::Index axis = 0; axis < n_coordinates(); ++axis) square += x[axis] * x[axis];
        return square < 1.0 ? 0.0 : -std::numeric_limits<double>::infinity();
    }
};

/// A unit Gaussian in n - 1 coordinates seen through a bend: the last coordinate is
/// x_{n-1} = y + c (x_0^2 - 1), y standard normal, independent of the rest.
class Curved : public CoordinateTarget {
  public:
    Curved(Eigen::Index n, double bend) : CoordinateTarget(n), bend_(bend) {}
    double log_density_at(const double* x) const override {
        const Eigen::Index last = n_coordinates() - 1;
        double sum = 0.0;
        for (Eigen::Index axis = 0; axis < last; ++axis) sum += x[axis] * x[axis];
        const double y = x[last] - bend_ * (x[0] * x[0] - 1.0);
        return -0.5 * (sum + y * y);
    }

  private:
    double bend_;
};

/// Another target seen through x -> scale x, scale a power of two.
class Scaled : public CoordinateTarget {
  public:
    Scaled(const CoordinateTarget& inner, double scale)
        : CoordinateTarget(inner.n_coordinates()), inner_(inner), scale_(scale) {}
    double log_density_at(const double* x) const override {
        const Eigen::VectorXd unscaled =
            Eigen::Map<const Eigen::VectorXd>(x, n_coordinates()) / scale_;
        return inner_.log_density_at(unscaled.data());
    }
    void draw_start(Stream& stream, Eigen::Ref<Eigen::VectorXd> coordinates) const override {
        inner_.draw_start(stream, coordinates);
        coordinates *= scale_;
    }

  private:
    const CoordinateTarget& inner_;
    double scale_;
};

/// Another target together with a Gaussian to propose from.
class Approximated : public CoordinateTarget {
  public:
    Approximated(const CoordinateTarget& inner, CoordinateGaussian approximation)
        : CoordinateTarget(inner.n_coordinates()),
          inner_(inner),
          approximation_(std::move(approximation)) {}
    double log_density_at(const double* x) const override { return inner_.log_density_at(x); }
    void draw_start(Stream& stream, Eigen::Ref<Eigen::VectorXd> coordinates) const override {
        inner_.draw_start(stream, coordinates);
    }
    const CoordinateGaussian* approximation() const override { return &approximation_; }

  private:
    const CoordinateTarget& inner_;
    CoordinateGaussian approximation_;
};

/// A unit Gaussian vector `v` (v.x, v.y, v.z), one constant and one redrawn parameter, Normal
/// about v.x with variance 1: the roles a survey's posterior has.
class VectorTarget : public CoordinateTarget {
  public:
    VectorTarget() : CoordinateTarget(3) {
        parameters_ = {{"v.x", "1", "a component", Role::sampled},
                       {"v.y", "1", "a component", Role::sampled},
                       {"v.z", "1", "a component", Role::sampled},
                       {"fixed", "1", "always 7", Role::constant},
                       {"level", "1", "integrated out", Role::redrawn}};
        vectors_ = {{"v", 0, true, true}};
    }
    double log_density_at(const double* x) const override {
        return -0.5 * (x[0] * x[0] + x[1] * x[1] + x[2] * x[2]);
    }
    void to_parameters(const Eigen::Ref<const Eigen::MatrixXd>& coordinates,
                       Eigen::Ref<Eigen::MatrixXd> parameters) const override {
        parameters.topRows(3) = coordinates;
        parameters.row(3).setConstant(7.0);
        parameters.row(4).setConstant(std::numeric_limits<double>::quiet_NaN());
    }
    void redraw(std::span<Stream> streams,
                Eigen::Ref<Eigen::MatrixXd> parameters) const override {
        for (Eigen::Index walker = 0; walker < parameters.cols(); ++walker)
            parameters(4, walker) =
                parameters(0, walker) + normal(streams[static_cast<std::size_t>(walker)]);
    }
};

}  // namespace deviascope::test
