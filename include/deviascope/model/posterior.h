// SPDX-License-Identifier: GPL-2.0-or-later
// counts -> MODEL -> ensemble
#pragma once

#include <memory>

#include "deviascope/core/target.h"
#include "deviascope/counts/count_map.h"
#include "deviascope/model/parameter_space.h"

namespace deviascope {

/// The posterior of a job: counts + model + priors, as the sampler sees it. Each walker is
/// answered by the moment engine where its bound allows, else by the pixel engine (or always by
/// the latter, if ModelOptions say so).
///
/// Log likelihood relative to the isotropic sky (beta = 0, D = 0), monopoles integrated out
///   ln L_b = [X_b - (N_b + a) ln((E_b + b) / (E0_b + b))]   with N_b, X_b, E_b divided by
///   phi_b,
/// or sampled: X_b + N_b [u - expm1(u + ln(E_b/E0_b))], u = ln(M_b E0_b / N_b), likewise over
/// phi_b; -M_b E_b where N_b = 0. Log posterior: plus the normalised log prior density
/// in the coordinates. Errors (constructor): InputError where a bin is empty under a
/// prior of shape 0.
class Posterior : public Target {
  public:
    /// Moments of the counts are computed here where the counts have none.
    /// @param seed  of the keyed draws behind `approximation`
    Posterior(const Counts& counts, const ModelOptions& options, std::uint64_t seed = 0);
    ~Posterior() override;

    const ParameterSpace& space() const;

    const std::vector<Parameter>& parameters() const override;
    const std::vector<VectorParameter>& vectors() const override;
    Eigen::Index n_coordinates() const override;
    void log_density(const Eigen::Ref<const Eigen::MatrixXd>& coordinates,
                     Eigen::Ref<Eigen::VectorXd> log_posterior,
                     Eigen::Ref<Eigen::VectorXd> log_likelihood) const override;
    void to_parameters(const Eigen::Ref<const Eigen::MatrixXd>& coordinates,
                       Eigen::Ref<Eigen::MatrixXd> parameters) const override;
    /// Monopoles from Gamma(N_b/phi + a, E_b/phi + b), in job order, from each walker's own
    /// stream.
    void redraw(std::span<Stream> streams,
                Eigen::Ref<Eigen::MatrixXd> parameters) const override;
    /// From the Laplace approximation with four times its covariance, inside the bounds of the
    /// priors. Vectors under `uniform-amplitude` are drawn in the vector and then turned into
    /// coordinates.
    void draw_start(Stream& stream, Eigen::Ref<Eigen::VectorXd> coordinates) const override;
    /// The Laplace approximation: mode and curvature by Newton's method from exact derivatives,
    /// bounds of the priors heeded.
    const CoordinateGaussian* approximation() const override;
    /// How often each engine has answered: "moment", "pixel".
    std::vector<EvaluationCount> evaluations() const override;
    /// What the search for the mode found doubtful.
    std::vector<std::string> warnings() const override;

  private:
    struct Parts;
    std::unique_ptr<Parts> parts_;
};

}  // namespace deviascope
