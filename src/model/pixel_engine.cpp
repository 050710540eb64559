// SPDX-License-Identifier: GPL-2.0-or-later
#include "deviascope/model/pixel_engine.h"

#include <algorithm>
#include <cmath>
#include <limits>
#include <vector>

#include "model/elementary.h"
#include "model/lorentz.h"
#include "model/pixel_block.h"
#include "model/sky_table.h"

namespace deviascope {
namespace {

/// Compensated addition of the blocks of pixels (Neumaier 1974, Z. angew. Math. Mech. 54, 39).
class BlockTotal {
  public:
    void add(double value) {
        const double sum = sum_ + value;
        lost_ +=
            std::abs(sum_) >= std::abs(value) ? (sum_ - sum) + value : (value - sum) + sum_;
        sum_ = sum;
    }
    double value() const { return sum_ + lost_; }

  private:
    double sum_ = 0.0;
    double lost_ = 0.0;
};

struct BinTotal {
    BlockTotal counted, exposed;
};

/// One walker made ready for one sky.
struct PreparedWalker {
    double log_gamma = 0.0;
    std::vector<BinOfWalker> bins;  ///< in the order of the dipoles and their bins
    std::vector<DipoleOfWalker> dipoles;
    WalkerOnSky walker;
    std::vector<BinTotal> totals;  ///< one a bin
};

using Row = Eigen::Ref<const Eigen::VectorXd>;

/// Bound of |ln(1 + v.n)|.
double furthest_log(double length) {
    return -std::log1p(-length);
}

BinOfWalker prepare(const SkyTable& sky, const BinTable& bin, const Row& row, double speed) {
    BinOfWalker prepared;
    prepared.exposure = sky.exposures[bin.exposure].value.data();
    prepared.count = bin.count.data();
    prepared.weight = row[bin.weight];
    prepared.furthest = std::abs(prepared.weight) * furthest_log(speed);
    return prepared;
}

PreparedWalker prepare(const SkyTable& sky, const Row& row) {
    PreparedWalker prepared;
    const Eigen::Vector3d velocity = row.head<3>();
    prepared.log_gamma = log_lorentz_factor(velocity);
    prepared.walker.receding = {-velocity.x(), -velocity.y(), -velocity.z()};
    prepared.bins.reserve(sky.n_bins());
    prepared.dipoles.reserve(sky.dipoles.size());
    for (const DipoleTable& table : sky.dipoles) {
        const Eigen::Vector3d vector = table.bias_ratio * row.segment<3>(table.intrinsic);
        const std::size_t first = prepared.bins.size();
        for (const BinTable& bin : table.bins) {
            prepared.bins.push_back(prepare(sky, bin, row, velocity.norm()));
            prepared.bins.back().furthest += furthest_log(vector.norm());
        }
        prepared.dipoles.push_back(
            {{vector.x(), vector.y(), vector.z()}, std::span(prepared.bins).subspan(first)});
    }
    prepared.walker.dipoles = prepared.dipoles;
    prepared.totals.resize(prepared.bins.size());
    return prepared;
}

void sum_over_blocks(const SkyTable& sky, std::vector<PreparedWalker>& walkers) {
    const PixelCentres centres{sky.x.data(), sky.y.data(), sky.z.data()};
    std::vector<PixelSums> sums(sky.n_bins());
    for (std::size_t first = 0; first < sky.n_padded(); first += block_size)
        for (PreparedWalker& walker : walkers) {
            sum_block(centres, first, walker.walker, sums);
            for (std::size_t bin = 0; bin < sums.size(); ++bin) {
                walker.totals[bin].counted.add(sums[bin].counted);
                walker.totals[bin].exposed.add(sums[bin].exposed);
            }
        }
}

/// ln(sum_p w_p exp(y_p) / sum_p w_p) about the largest y, for where a sum of expm1 would lose
/// its digits or overflow.
double log_mean_about_largest(const SkyTable& sky,
                              const ExposureTable& exposure,
                              const PreparedWalker& prepared,
                              const DipoleOfWalker& dipole,
                              double weight) {
    const Eigen::Map<const Eigen::Vector3d> receding(prepared.walker.receding.data());
    const Eigen::Map<const Eigen::Vector3d> vector(dipole.vector.data());
    const auto y = [&](std::size_t p) {
        using elementary::Reach;
        const Eigen::Vector3d centre(sky.x[p], sky.y[p], sky.z[p]);
        return elementary::log1p<Reach::far>(vector.dot(centre)) -
               weight * elementary::log1p<Reach::far>(receding.dot(centre));
    };
    double largest = -std::numeric_limits<double>::infinity();
    for (std::size_t p = 0; p < sky.n_padded(); ++p)
        if (exposure.value[p] > 0.0) largest = std::max(largest, y(p));
    double sum = 0.0;
    for (std::size_t p = 0; p < sky.n_padded(); ++p)
        if (exposure.value[p] > 0.0) sum += exposure.value[p] * std::exp(y(p) - largest);
    return largest + std::log(sum / exposure.sum);
}

/// ln(E_b / E0_b) without gamma.
double log_mean(const SkyTable& sky,
                const ExposureTable& exposure,
                const PreparedWalker& prepared,
                const DipoleOfWalker& dipole,
                std::size_t bin) {
    constexpr double cancels = -0.999;
    const BinOfWalker& of_walker = prepared.bins[bin];
    const double excess = prepared.totals[bin].exposed.value() / exposure.sum;
    if (excess > cancels && of_walker.furthest < elementary::expm1_furthest - 8.0)
        return std::log1p(excess);
    return log_mean_about_largest(sky, exposure, prepared, dipole, of_walker.weight);
}

void finish(const SkyTable& sky,
            const PreparedWalker& prepared,
            Eigen::Ref<Eigen::VectorXd> counted,
            Eigen::Ref<Eigen::VectorXd> log_expected) {
    std::size_t next = 0;
    for (std::size_t d = 0; d < sky.dipoles.size(); ++d)
        for (const BinTable& bin : sky.dipoles[d].bins) {
            const double gamma_term = prepared.bins[next].weight * prepared.log_gamma;
            const ExposureTable& exposure = sky.exposures[bin.exposure];
            counted[bin.term] =
                prepared.totals[next].counted.value() - gamma_term * bin.sources;
            log_expected[bin.term] =
                log_mean(sky, exposure, prepared, prepared.dipoles[d], next) - gamma_term;
            ++next;
        }
}

}  // namespace

struct PixelEngine::Tables {
    std::vector<SkyTable> skies;
};

PixelEngine::PixelEngine(const Counts& counts, const ParameterSpace& space)
    : tables_(new Tables{make_sky_tables(counts, space)}) {}
PixelEngine::~PixelEngine() = default;
PixelEngine::PixelEngine(PixelEngine&&) noexcept = default;

void PixelEngine::sums(const Eigen::Ref<const Eigen::MatrixXd>& parameters,
                       Eigen::Ref<Eigen::MatrixXd> counted,
                       Eigen::Ref<Eigen::MatrixXd> log_expected) const {
    for (const SkyTable& sky : tables_->skies) {
        std::vector<PreparedWalker> walkers;
        walkers.reserve(static_cast<std::size_t>(parameters.cols()));
        for (Eigen::Index w = 0; w < parameters.cols(); ++w)
            walkers.push_back(prepare(sky, parameters.col(w)));
        sum_over_blocks(sky, walkers);
        for (Eigen::Index w = 0; w < parameters.cols(); ++w)
            finish(
                sky, walkers[static_cast<std::size_t>(w)], counted.col(w), log_expected.col(w));
    }
}

}  // namespace deviascope
