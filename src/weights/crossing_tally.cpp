// SPDX-License-Identifier: GPL-2.0-or-later
#include "weights/crossing_tally.h"

#include <algorithm>
#include <array>
#include <cmath>

#include "core/lanes.h"
#include "deviascope/core/parallel.h"
#include "deviascope/core/random.h"

namespace deviascope {

namespace {

constexpr std::size_t rows_a_slice = 4096;
constexpr std::size_t most_named = 5;

/// Multiplicities Poisson(1) by their rank among 2^16: the inverse of the cumulative
/// probability, rounded to 2^-16. Mean 1 - 1e-5 and variance 1 to 1e-4; the largest value is 7.
class Multiplicities {
  public:
    Multiplicities() {
        double probability = std::exp(-1.0);
        double cumulative = probability;
        std::uint8_t value = 0;
        for (std::size_t rank = 0; rank < of_rank_.size(); ++rank) {
            while (static_cast<double>(rank) + 0.5 >
                   cumulative * static_cast<double>(of_rank_.size())) {
                probability /= ++value;
                cumulative += probability;
            }
            of_rank_[rank] = value;
        }
    }
    /// The next `block` multiplicities of a stream, four from each of its words.
    void draw(Stream& stream, std::array<double, CrossingTally::block>& out) const {
        std::uint64_t word = 0;
        for (std::size_t i = 0; i < out.size(); ++i) {
            word = i % 4 == 0 ? stream() : word >> 16U;
            out[i] = of_rank_[word & 0xffffU];
        }
    }

  private:
    std::array<std::uint8_t, 1U << 16U> of_rank_{};
};

/// sum += factor times multiplicity, replicate by replicate.
DEVIASCOPE_WIDEST_INSTRUCTIONS
void add_multiples(const double* multiplicity, double factor, double* sum) {
    for (std::size_t r = 0; r < CrossingTally::block; ++r) sum[r] += factor * multiplicity[r];
}

const Multiplicities& multiplicities() {
    static const Multiplicities table;
    return table;
}

}  // namespace

CrossingTally::CrossingTally(const Boxes& boxes, const TallyOptions& options)
    : boxes_(boxes),
      options_(options),
      extent_(2 * boxes.edge.size(), 0.0),
      sources_in_box_(boxes.box.size(), 0) {
    for (std::size_t e = 0; e < boxes.edge.size(); ++e) {
        cells_.emplace_back(neighbourhood_of(boxes.edge[e].kind));
        sums_of_.push_back(options.weights_vary ? e : boxes.first_like(e));
        first_slot_.push_back(n_slots_);
        if (sums_of_[e] == e) n_slots_ += EdgeCells::number;
    }
    n_slots_ += boxes.box.size();
    const auto replicates = static_cast<std::size_t>(options.replicates);
    blocks_.resize((replicates + block - 1) / block);
    const std::size_t n_index = options.index_varies ? n_slots_ : 0;
    catalogue_.count.resize(n_slots_);
    catalogue_.index.resize(n_index);
    for (Block& b : blocks_) {
        b.count.resize(n_slots_ * block);
        b.index.resize(n_index * block);
    }
}

void CrossingTally::add(const SourceBatch& batch) {
    const std::size_t n_slices = (batch.kept.size() + rows_a_slice - 1) / rows_a_slice;
    slices_.resize(n_slices);
    parallel_for(n_slices, options_.threads, [&](std::size_t i) {
        const std::size_t begin = i * rows_a_slice;
        look_at(batch, begin, std::min(begin + rows_a_slice, batch.kept.size()), slices_[i]);
    });
    for (const Slice& slice : slices_) merge(slice);
    parallel_for(blocks_.size() + 1, options_.threads, [&](std::size_t i) {
        i == blocks_.size() ? add_to_catalogue(slices_) : add_to_block(i, slices_);
    });
}

void CrossingTally::look_at(const SourceBatch& batch,
                            std::size_t begin,
                            std::size_t end,
                            Slice& slice) const {
    slice.terms.clear();
    slice.extent.assign(extent_.size(), 0.0);
    slice.sources_in_box.assign(sources_in_box_.size(), 0);
    slice.without_index.clear();
    slice.n_without_index = 0;
    std::vector<double> y(boxes_.dimension.size());
    for (std::size_t row = begin; row < end; ++row) {
        if (batch.kept[row] == 0) continue;
        for (std::size_t d = 0; d < y.size(); ++d)
            y[d] = coordinate_of(boxes_.dimension[d].kind, batch.value[d][row]);
        look_at_row(batch, row, y, slice);
    }
}

/// A source inside a box may cross any of its edges; one that misses a single side may cross
/// the edges of that side; any other lies across a corner and crosses nothing.
void CrossingTally::look_at_row(const SourceBatch& batch,
                                std::size_t row,
                                const std::vector<double>& y,
                                Slice& slice) const {
    for (std::size_t b = 0; b < boxes_.box.size(); ++b) {
        if (!batch.weight.empty() && batch.weight[b][row] == 0.0) continue;
        const std::vector<BoxSide>& sides = boxes_.box[b].sides;
        std::size_t n_missed = 0;
        std::size_t missed = 0;
        for (std::size_t s = 0; s < sides.size() && n_missed < 2; ++s) {
            const double value = batch.value[sides[s].dimension][row];
            if (value >= sides[s].low && value < sides[s].high) continue;
            ++n_missed;
            missed = s;
        }
        if (n_missed > 1) continue;
        if (n_missed == 1) {
            add_edges(batch, row, y, b, missed, slice);
            continue;
        }
        for (std::size_t s = 0; s < sides.size(); ++s) add_edges(batch, row, y, b, s, slice);
        const double weight = batch.weight.empty() ? 1.0 : batch.weight[b][row];
        const auto source = batch.first_source + static_cast<std::int64_t>(row);
        slice.terms.push_back({source, slot_of_box(b), weight, 0.0});
        ++slice.sources_in_box[b];
    }
}

void CrossingTally::add_edges(const SourceBatch& batch,
                              std::size_t row,
                              const std::vector<double>& y,
                              std::size_t box,
                              std::size_t side,
                              Slice& slice) const {
    const std::size_t dimension = boxes_.box[box].sides[side].dimension;
    const double value = batch.value[dimension][row];
    const double weight = batch.weight.empty() ? 1.0 : batch.weight[box][row];
    const auto source = batch.first_source + static_cast<std::int64_t>(row);
    for (const std::size_t e : boxes_.edges_of_side[boxes_.first_side[box] + side]) {
        if (sums_of_[e] != e) continue;
        const Edge& edge = boxes_.edge[e];
        const double distance = std::abs(y[dimension] - edge.centre);
        if (std::isnan(distance)) continue;
        const bool above = value >= edge.value;
        double& extent = slice.extent[2 * e + (above ? 1 : 0)];
        extent = std::max(extent, distance);
        if (distance >= cells_[e].reach()) continue;
        double index = 0.0;
        if (feels_spectral_index(edge.kind) && options_.index_varies) {
            index = batch.one_plus_alpha[row];
            if (!std::isfinite(index)) {
                ++slice.n_without_index;
                auto& named = slice.without_index;
                if (named.size() < most_named && (named.empty() || named.back() != source))
                    named.push_back(source);
                continue;
            }
        }
        slice.terms.push_back(
            {source, first_slot_[e] + cells_[e].cell(distance, above), weight, weight * index});
    }
}

void CrossingTally::merge(const Slice& slice) {
    for (std::size_t i = 0; i < extent_.size(); ++i)
        extent_[i] = std::max(extent_[i], slice.extent[i]);
    for (std::size_t b = 0; b < sources_in_box_.size(); ++b)
        sources_in_box_[b] += slice.sources_in_box[b];
    without_index_ += slice.n_without_index;
    for (const std::int64_t source : slice.without_index)
        if (first_without_.size() < most_named) first_without_.push_back(source);
}

void CrossingTally::add_to_catalogue(const std::vector<Slice>& slices) {
    for (const Slice& slice : slices) {
        for (const Term& term : slice.terms) {
            catalogue_.count[term.slot] += term.weight;
            if (options_.index_varies) catalogue_.index[term.slot] += term.weight_times_index;
        }
    }
}

void CrossingTally::add_to_block(std::size_t number, const std::vector<Slice>& slices) {
    Block& sums = blocks_[number];
    std::array<double, block> multiplicity{};
    for (const Slice& slice : slices) {
        std::int64_t source = -1;
        for (const Term& term : slice.terms) {
            if (term.source != source) {
                source = term.source;
                Stream stream(options_.seed,
                              Purpose::bootstrap,
                              static_cast<std::uint64_t>(source),
                              options_.survey,
                              number);
                multiplicities().draw(stream, multiplicity);
            }
            const std::size_t place = term.slot * block;
            add_multiples(multiplicity.data(), term.weight, &sums.count[place]);
            if (term.weight_times_index != 0.0)
                add_multiples(multiplicity.data(), term.weight_times_index, &sums.index[place]);
        }
    }
}

std::vector<double> CrossingTally::sums(std::size_t edge,
                                        std::size_t replicate,
                                        bool index) const {
    const std::size_t stride = replicate == 0 ? 1 : block;
    const std::size_t lane = replicate == 0 ? 0 : (replicate - 1) % block;
    const Block& from = replicate == 0 ? catalogue_ : blocks_[(replicate - 1) / block];
    const std::vector<double>& values = index ? from.index : from.count;
    std::vector<double> out(EdgeCells::number);
    for (std::size_t cell = 0; cell < out.size(); ++cell)
        out[cell] = values[(first_slot_[sums_of_[edge]] + cell) * stride + lane];
    return out;
}

std::vector<double> CrossingTally::counts(std::size_t edge, std::size_t replicate) const {
    return sums(edge, replicate, false);
}

std::vector<double> CrossingTally::index_sums(std::size_t edge, std::size_t replicate) const {
    return sums(edge, replicate, true);
}

double CrossingTally::in_box(std::size_t box, std::size_t replicate) const {
    if (replicate == 0) return catalogue_.count[slot_of_box(box)];
    return blocks_[(replicate - 1) / block]
        .count[slot_of_box(box) * block + (replicate - 1) % block];
}

}  // namespace deviascope
