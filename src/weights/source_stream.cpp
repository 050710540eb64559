// SPDX-License-Identifier: GPL-2.0-or-later
#include "weights/source_stream.h"

#include <fmt/format.h>

#include <algorithm>
#include <cmath>
#include <limits>

#include "counts/offending_rows.h"
#include "deviascope/core/error.h"
#include "deviascope/core/grouped_number.h"
#include "deviascope/core/random.h"

namespace deviascope {

namespace {

void require_spectral_index(const SurveyInput& survey, const SourcePhysics& physics) {
    if (physics.alpha || survey.columns.contains("alpha")) return;
    throw UsageError({"survey " + survey.name,
                      "weights are to be measured at edges of flux or magnitude, and there is "
                      "no spectral index",
                      "a column alpha, or alpha = { mean = …, sd = … }",
                      "add one of them (alpha = 1 for bolometric fluxes and magnitudes)"});
}

}  // namespace

SourceStream::SourceStream(const SurveyInput& survey,
                           const SourcePhysics& physics,
                           const Boxes& boxes,
                           const Pixelisation& grid,
                           Frame frame,
                           const WeighOptions& options)
    : survey_(survey),
      physics_(physics),
      boxes_(boxes),
      options_(options),
      grid_(grid),
      rows_(survey),
      sky_(survey, grid_, frame),
      selection_{survey_, rows_, sky_, grid_, frame},
      places_(selection_) {
    for (const Dimension& dimension : boxes.dimension)
        column_.push_back(index_among(rows_.columns, survey.columns.at(dimension.property)));
    if (boxes.need_spectral_index()) {
        require_spectral_index(survey, physics);
        if (survey.columns.contains("alpha"))
            alpha_column_ = index_among(rows_.columns, survey.columns.at("alpha"));
        index_varies_ = alpha_column_ || physics.alpha->sd > 0.0;
        one_plus_alpha_ = alpha_column_ ? std::numeric_limits<double>::quiet_NaN()
                                        : 1.0 + physics.alpha->mean;
    }
    if (sky_.footprints().size() < 2) return;
    for (const Footprint& footprint : sky_.footprints()) {
        std::vector<double>& map = exposure_.emplace_back(grid.n_pixels(), 0.0);
        for (std::size_t i = 0; i < footprint.pixel.size(); ++i)
            map[static_cast<std::size_t>(footprint.pixel[i])] = footprint.exposure[i];
    }
}

void SourceStream::read(const std::function<void(const SourceBatch&)>& use) {
    OffendingRows bad_positions;
    SourceBatch batch;
    TableChunk chunk;
    std::int64_t n_read = 0;
    for (const auto& path : survey_.catalogue) {
        const auto reader = open_table(path, survey_.table, rows_.columns);
        starts_.push_back({n_read, path});
        while (reader->next(chunk)) {
            places_.locate(chunk);
            for (std::size_t row = 0; row < static_cast<std::size_t>(chunk.n_rows()); ++row)
                if (places_.is_bad(row))
                    bad_positions.add([&] {
                        return fmt::format(
                            "{} {}",
                            path.filename().string(),
                            reader->place_of_row(chunk.first_row +
                                                 static_cast<std::int64_t>(row)));
                    });
            batch.first_source = n_read;
            fill(chunk, batch);
            use(batch);
            n_read += chunk.n_rows();
            if (options_.progress)
                options_.progress(
                    fmt::format("{}: {} rows weighed", survey_.name, grouped(n_read)));
        }
    }
    refuse_bad_positions(survey_, bad_positions);
}

std::string SourceStream::place_of(std::int64_t source) const {
    const auto after = std::ranges::upper_bound(starts_, source, {}, &FileStart::source);
    const FileStart& file = *std::prev(after);
    const auto reader = open_table(file.path, survey_.table, rows_.columns);
    return fmt::format(
        "{} {}", file.path.filename().string(), reader->place_of_row(source - file.source));
}

void SourceStream::fill(const TableChunk& chunk, SourceBatch& batch) {
    const auto n_rows = static_cast<std::size_t>(chunk.n_rows());
    batch.value.clear();
    for (const std::size_t column : column_) batch.value.emplace_back(chunk.column[column]);
    batch.kept.resize(n_rows);
    for (std::size_t row = 0; row < n_rows; ++row)
        batch.kept[row] = !places_.is_bad(row) && places_.sky_cut(row) == SkyCuts::kept &&
                          !places_.is_hole(row);
    if (index_varies_) fill_index(chunk, batch);
    if (!exposure_.empty()) fill_weights(chunk, batch);
}

double SourceStream::drawn_index(std::int64_t source) const {
    Stream stream(options_.seed,
                  Purpose::spectral_index,
                  static_cast<std::uint64_t>(source),
                  options_.survey,
                  0);
    return physics_.alpha->mean + physics_.alpha->sd * normal(stream);
}

void SourceStream::fill_index(const TableChunk& chunk, SourceBatch& batch) {
    batch.one_plus_alpha.resize(batch.kept.size());
    for (std::size_t row = 0; row < batch.kept.size(); ++row) {
        const auto source = batch.first_source + static_cast<std::int64_t>(row);
        double alpha = alpha_column_ ? chunk.column[*alpha_column_][row] : drawn_index(source);
        if (!std::isfinite(alpha) && physics_.alpha) {
            alpha = drawn_index(source);
            n_filled_ += batch.kept[row];
        }
        batch.one_plus_alpha[row] = 1.0 + alpha;
    }
}

std::optional<std::size_t> SourceStream::home_of(const TableChunk& chunk,
                                                 std::size_t row) const {
    if (!holds(rows_.survey, chunk, row)) return std::nullopt;
    for (const std::size_t bin : rows_.selecting_bins)
        if (holds(rows_.bins[bin], chunk, row)) return bin;
    return std::nullopt;
}

double SourceStream::weight_in(std::size_t bin,
                               std::int64_t pixel,
                               std::optional<std::size_t> home) const {
    const auto exposure = [&](std::size_t of) {
        return exposure_[sky_.footprint_of_bin(of)][static_cast<std::size_t>(pixel)];
    };
    if (!home) return exposure(bin) > 0.0 ? 1.0 : 0.0;
    return exposure(*home) > 0.0 ? exposure(bin) / exposure(*home) : 0.0;
}

void SourceStream::fill_weights(const TableChunk& chunk, SourceBatch& batch) {
    batch.weight.assign(boxes_.box.size(), std::vector<double>(batch.kept.size(), 0.0));
    for (std::size_t row = 0; row < batch.kept.size(); ++row) {
        if (batch.kept[row] == 0) continue;
        const auto home = home_of(chunk, row);
        if (home && !sky_.exposes(*home, places_.pixel(row), places_.direction(row))) continue;
        for (std::size_t b = 0; b < boxes_.box.size(); ++b)
            batch.weight[b][row] = weight_in(boxes_.box[b].bin, places_.pixel(row), home);
    }
}

}  // namespace deviascope
