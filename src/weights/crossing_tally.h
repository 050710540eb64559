// SPDX-License-Identifier: GPL-2.0-or-later
// WEIGHTS (private): sources near the edges of bins, counted in cells, with their bootstrap
#pragma once

#include <cstdint>
#include <span>
#include <vector>

#include "weights/box.h"
#include "weights/edge_cells.h"

namespace deviascope {

/// Some sources of a survey that its sky cuts keep.
struct SourceBatch {
    std::int64_t first_source = 0;               ///< number, in the survey, of row 0
    std::vector<std::span<const double>> value;  ///< [dimension][row], in the column's unit
    std::vector<char> kept;                      ///< [row]: by the cuts on the sky
    std::vector<double> one_plus_alpha;          ///< [row]; empty where it does not vary
    /// [box][row]: what the source counts for in a box: exposure of that bin at its place over
    /// that of the bin it is in; 0: not at all. Empty where all bins are exposed alike.
    std::vector<std::vector<double>> weight;
};

struct TallyOptions {
    std::uint64_t seed = 0;
    std::uint64_t survey = 0;  ///< number of the survey in the job
    int replicates = 0;        ///< bootstrap replicates; 0: the catalogue alone
    int threads = 1;
    /// Whether 1 + alpha differs from source to source, so that its sums are kept.
    bool index_varies = false;
    /// Whether batches carry weights, which differ from box to box.
    bool weights_vary = false;
};

/// Sums over the sources of a survey, for the catalogue itself and for each bootstrap replicate
/// (Efron 1979, Ann. Stat. 7, 1; with Poisson(1) multiplicities in place of multinomial ones,
/// Hanley & MacGibbon 2006, Comput. Methods Programs Biomed. 83, 57): for every edge the
/// weights of sources in each cell, and those times 1 + alpha; for every box the weights of
/// the sources in it.
///
/// A source near an edge of a box is one that lies inside all its other sides. In a replicate
/// it counts with its own multiplicity everywhere, so that what edges, bins and totals share is
/// shared by their errors. Multiplicities: stream (seed, bootstrap; source, survey, block of 25
/// replicates). A block is summed by one thread in the order of the sources: the same bits for
/// any number of threads. Memory does not grow with the number of sources.
class CrossingTally {
  public:
    static constexpr std::size_t block = 25;  ///< replicates that share a stream

    CrossingTally(const Boxes& boxes, const TallyOptions& options);

    void add(const SourceBatch& batch);

    /// Replicates that are kept: a multiple of `block`, at least as many as asked for.
    std::size_t n_replicates() const { return blocks_.size() * block; }
    /// Whether sums with 1 + alpha are kept.
    bool index_varies() const { return options_.index_varies; }
    const EdgeCells& cells(std::size_t edge) const { return cells_[edge]; }
    /// The edge whose sums an edge shares: itself, or an earlier one.
    std::size_t sums_of(std::size_t edge) const { return sums_of_[edge]; }

    /// Of replicate `replicate` (0: the catalogue, 1 …: bootstrap), the sums of an edge's cells
    /// (EdgeCells::number of them).
    std::vector<double> counts(std::size_t edge, std::size_t replicate) const;
    /// Likewise, of weight times 1 + alpha. Only where `index_varies`.
    std::vector<double> index_sums(std::size_t edge, std::size_t replicate) const;
    /// Sum of the weights of the sources in a box.
    double in_box(std::size_t box, std::size_t replicate) const;
    /// Sources in a box, each once.
    std::int64_t sources_in_box(std::size_t box) const { return sources_in_box_[box]; }
    /// Largest distance from the edge, in y, of a source near it, below and above.
    double extent_below(std::size_t edge) const { return extent_[2 * sums_of_[edge]]; }
    double extent_above(std::size_t edge) const { return extent_[2 * sums_of_[edge] + 1]; }
    /// Sources near some edge, or in a box, without a value of 1 + alpha.
    std::int64_t sources_without_index() const { return without_index_; }
    /// The numbers of the first of them, five at most.
    const std::vector<std::int64_t>& first_without_index() const { return first_without_; }

  private:
    /// One term of a sum: a source and what it adds where.
    struct Term {
        std::int64_t source;
        std::size_t slot;
        double weight;
        double weight_times_index;
    };
    /// What the rows of one slice of a batch add.
    struct Slice {
        std::vector<Term> terms;
        std::vector<double> extent;
        std::vector<std::int64_t> sources_in_box;
        std::vector<std::int64_t> without_index;  // the first five
        std::int64_t n_without_index = 0;
    };
    /// Sums of neighbouring replicates: [slot][replicate of the block].
    struct Block {
        std::vector<double> count;
        std::vector<double> index;
    };

    void look_at(const SourceBatch& batch,
                 std::size_t begin,
                 std::size_t end,
                 Slice& slice) const;
    /// @param y  coordinates of the row, one a dimension
    void look_at_row(const SourceBatch& batch,
                     std::size_t row,
                     const std::vector<double>& y,
                     Slice& slice) const;
    void add_edges(const SourceBatch& batch,
                   std::size_t row,
                   const std::vector<double>& y,
                   std::size_t box,
                   std::size_t side,
                   Slice& slice) const;
    void merge(const Slice& slice);
    void add_to_catalogue(const std::vector<Slice>& slices);
    void add_to_block(std::size_t number, const std::vector<Slice>& slices);
    std::vector<double> sums(std::size_t edge, std::size_t replicate, bool index) const;
    std::size_t slot_of_box(std::size_t box) const {
        return n_slots_ - boxes_.box.size() + box;
    }

    const Boxes& boxes_;
    TallyOptions options_;
    std::vector<EdgeCells> cells_;
    std::vector<std::size_t> sums_of_;     // of each edge
    std::vector<std::size_t> first_slot_;  // of each edge that has sums of its own
    std::size_t n_slots_ = 0;
    Block catalogue_;  // a block of one replicate
    std::vector<Block> blocks_;
    std::vector<double> extent_;
    std::vector<std::int64_t> sources_in_box_;
    std::int64_t without_index_ = 0;
    std::vector<std::int64_t> first_without_;
    std::vector<Slice> slices_;  // of the batch at hand; kept for their memory
};

}  // namespace deviascope
