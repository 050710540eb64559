// SPDX-License-Identifier: GPL-2.0-or-later
#include "deviascope/counts/moments.h"

#include <algorithm>
#include <memory>
#include <numeric>
#include <vector>

#include "core/lanes.h"
#include "counts/monomials.h"

namespace deviascope {

namespace {

constexpr int highest_degree = moment_degree + 1;
constexpr std::size_t n_highest = n_monomials(highest_degree);
constexpr std::size_t lanes_per_block = 8;
constexpr std::size_t block_size = lanes_per_block * n_lanes;

/// One number for each pixel of a block.
struct BlockRow {
    Lanes lanes[lanes_per_block];

    void set(std::size_t pixel, double value) {
        lanes[pixel / n_lanes][pixel % n_lanes] = value;
    }
};

/// The monomials of a block of pixels, and what is to be summed with each.
struct Block {
    BlockRow x, y, z;
    BlockRow monomial[n_highest];
    std::vector<BlockRow> value;  ///< quantities
};

[[gnu::always_inline]] inline void fill_monomials(Block& block) {
    Lanes column[n_highest];
    for (std::size_t at = 0; at < lanes_per_block; ++at) {
        column[0] = Lanes{} + 1.0;
        for (int degree = 1; degree <= highest_degree; ++degree)
            fill_degree(
                block.x.lanes[at], block.y.lanes[at], block.z.lanes[at], degree, column);
        for (std::size_t m = 0; m < n_highest; ++m) block.monomial[m].lanes[at] = column[m];
    }
}

[[gnu::always_inline]] inline double sum_of(const Lanes& lanes) {
    return ((lanes[0] + lanes[4]) + (lanes[2] + lanes[6])) +
           ((lanes[1] + lanes[5]) + (lanes[3] + lanes[7]));
}

/// sums[quantity * n_highest + m] = sum over the block of value times monomial.
DEVIASCOPE_WIDEST_INSTRUCTIONS
void sum_block(Block& block, std::size_t n_quantities, double* sums) {
    fill_monomials(block);
    for (std::size_t quantity = 0; quantity < n_quantities; ++quantity) {
        const Lanes* value = block.value[quantity].lanes;
        for (std::size_t m = 0; m < n_highest; ++m) {
            const Lanes* monomial = block.monomial[m].lanes;
            Lanes sum = value[0] * monomial[0];
            for (std::size_t at = 1; at < lanes_per_block; ++at)
                sum += value[at] * monomial[at];
            sums[quantity * n_highest + m] = sum_of(sum);
        }
    }
}

/// What is summed over one footprint: its exposure, then the excess counts of its bins.
struct Quantities {
    const Footprint* footprint;
    std::vector<const BinCounts*> bins;
    std::vector<double> expected;  ///< N / sum w of each bin

    std::size_t size() const { return 1 + bins.size(); }
    double value(std::size_t quantity, std::size_t pixel) const {
        const double exposure = footprint->exposure[pixel];
        if (quantity == 0) return exposure;
        return static_cast<double>(bins[quantity - 1]->count[pixel]) -
               expected[quantity - 1] * exposure;
    }
};

void load(const Quantities& all, const Pixelisation& grid, std::size_t first, Block& block) {
    const std::size_t n_pixels = all.footprint->pixel.size();
    for (std::size_t offset = 0; offset < block_size; ++offset) {
        const std::size_t pixel = first + offset;
        const bool is_there = pixel < n_pixels;
        const Direction centre =
            is_there ? grid.centre(all.footprint->pixel[pixel]) : Direction(0.0, 0.0, 1.0);
        block.x.set(offset, centre.x());
        block.y.set(offset, centre.y());
        block.z.set(offset, centre.z());
        for (std::size_t quantity = 0; quantity < all.size(); ++quantity)
            block.value[quantity].set(offset, is_there ? all.value(quantity, pixel) : 0.0);
    }
}

/// quantities x n_highest
std::vector<long double> sums_over(const Quantities& all, const Pixelisation& grid) {
    std::vector<long double> total(all.size() * n_highest, 0.0L);
    std::vector<double> sums(total.size());
    const auto block = std::make_unique<Block>();
    block->value.resize(all.size());
    for (std::size_t first = 0; first < all.footprint->pixel.size(); first += block_size) {
        load(all, grid, first, *block);
        sum_block(*block, all.size(), sums.data());
        for (std::size_t at = 0; at < total.size(); ++at)
            total[at] += static_cast<long double>(sums[at]);
    }
    return total;
}

std::vector<double> exposure_moments(const std::vector<long double>& sums) {
    std::vector<double> moments(n_highest);
    for (std::size_t m = 0; m < moments.size(); ++m)
        moments[m] = static_cast<double>(sums[m] / sums[0]);
    return moments;
}

/// The excess sums to 0 but for the rounding of N / sum w, which is taken out again.
std::vector<double> excess_moments(const std::vector<long double>& sums, std::size_t quantity) {
    const long double* excess = sums.data() + quantity * n_highest;
    std::vector<double> moments(n_monomials(moment_degree));
    for (std::size_t m = 0; m < moments.size(); ++m)
        moments[m] = static_cast<double>(excess[m] - excess[0] * sums[m] / sums[0]);
    return moments;
}

void add_moments(SurveyCounts& survey, std::size_t index, const Pixelisation& grid) {
    Footprint& footprint = survey.footprints[index];
    const long double exposed = std::accumulate(
        footprint.exposure.begin(), footprint.exposure.end(), 0.0L, std::plus<long double>());
    Quantities all{&footprint, {}, {}};
    std::vector<BinCounts*> bins;
    for (BinCounts& bin : survey.bins)
        if (bin.footprint == index) {
            bins.push_back(&bin);
            all.bins.push_back(&bin);
            all.expected.push_back(
                static_cast<double>(static_cast<long double>(bin.total()) / exposed));
        }
    const std::vector<long double> sums = sums_over(all, grid);
    footprint.moment = exposure_moments(sums);
    for (std::size_t bin = 0; bin < bins.size(); ++bin)
        bins[bin]->excess_moment = excess_moments(sums, bin + 1);
}

bool has_moments(const SurveyCounts& survey) {
    return std::all_of(survey.footprints.begin(),
                       survey.footprints.end(),
                       [](const Footprint& f) { return f.moment.size() == n_highest; }) &&
           std::all_of(survey.bins.begin(), survey.bins.end(), [](const BinCounts& b) {
               return b.excess_moment.size() == n_monomials(moment_degree);
           });
}

}  // namespace

void add_moments(Counts& counts) {
    const Pixelisation grid(counts.nside);
    for (SurveyCounts& survey : counts.surveys) {
        if (has_moments(survey)) continue;
        for (std::size_t index = 0; index < survey.footprints.size(); ++index)
            add_moments(survey, index, grid);
    }
}

bool has_moments(const Counts& counts) {
    return std::all_of(counts.surveys.begin(),
                       counts.surveys.end(),
                       [](const SurveyCounts& survey) { return has_moments(survey); });
}

}  // namespace deviascope
