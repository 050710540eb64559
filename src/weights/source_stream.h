// SPDX-License-Identifier: GPL-2.0-or-later
// WEIGHTS (private): the sources of a survey, piece by piece
#pragma once

#include <filesystem>
#include <functional>
#include <optional>
#include <string>
#include <vector>

#include "counts/row_places.h"
#include "deviascope/weights/measure_weights.h"
#include "weights/crossing_tally.h"

namespace deviascope {

/// Reads the catalogue of a survey once, in chunks, and hands its sources on.
class SourceStream {
  public:
    /// Errors: UsageError where an edge needs a spectral index and there is none; InputError:
    /// maps, as count_survey.
    SourceStream(const SurveyInput& survey,
                 const SourcePhysics& physics,
                 const Boxes& boxes,
                 const Pixelisation& grid,
                 Frame frame,
                 const WeighOptions& options);

    /// 1 + alpha where it is the survey's mean for all sources; NaN where each has its own.
    double one_plus_alpha() const { return one_plus_alpha_; }
    /// Whether `one_plus_alpha` of the batches is filled.
    bool index_varies() const { return index_varies_; }

    /// Whether `weight` of the batches is filled.
    bool weights_vary() const { return !exposure_.empty(); }

    /// Calls `use` with one batch after another. Errors: InputError: rows with bad positions
    /// (unless they are to be skipped); files that cannot be read; what `progress` throws.
    void read(const std::function<void(const SourceBatch&)>& use);

    /// How a person finds a source: `dunlin.fits row 12`.
    std::string place_of(std::int64_t source) const;
    /// Sources whose missing index was taken from the survey's mean.
    std::int64_t n_filled() const { return n_filled_; }

  private:
    void fill(const TableChunk& chunk, SourceBatch& batch);
    void fill_index(const TableChunk& chunk, SourceBatch& batch);
    void fill_weights(const TableChunk& chunk, SourceBatch& batch);
    double drawn_index(std::int64_t source) const;
    double weight_in(std::size_t bin,
                     std::int64_t pixel,
                     std::optional<std::size_t> home) const;
    std::optional<std::size_t> home_of(const TableChunk& chunk, std::size_t row) const;

    const SurveyInput& survey_;
    const SourcePhysics& physics_;
    const Boxes& boxes_;
    const WeighOptions& options_;
    Pixelisation grid_;
    RowSelection rows_;
    SkyCuts sky_;
    Selection selection_;
    RowPlaces places_;
    std::vector<std::size_t> column_;  // of each dimension
    std::optional<std::size_t> alpha_column_;
    double one_plus_alpha_ = 1.0;
    bool index_varies_ = false;
    std::vector<std::vector<double>> exposure_;  // of each footprint, [pixel]; only if several
    std::int64_t n_filled_ = 0;

    struct FileStart {
        std::int64_t source;
        std::filesystem::path path;
    };
    std::vector<FileStart> starts_;
};

}  // namespace deviascope
