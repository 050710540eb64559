// SPDX-License-Identifier: GPL-2.0-or-later
#include "deviascope/counts/count_sources.h"

#include <fmt/format.h>

#include <algorithm>
#include <cctype>
#include <cmath>
#include <iterator>
#include <optional>

#include "counts/lopsided_counts.h"
#include "counts/map_counter.h"
#include "counts/row_counter.h"
#include "deviascope/core/error.h"
#include "deviascope/core/grouped_number.h"
#include "deviascope/core/physical_constants.h"

namespace deviascope {

namespace {

/// How far the reading of a survey's files is.
class RowProgress {
  public:
    RowProgress(const SurveyInput& survey, const Progress& progress)
        : survey_(survey.name), progress_(progress) {}
    void expect(std::optional<std::int64_t> n_rows) {
        total_ = total_ && n_rows ? std::optional(*total_ + *n_rows) : std::nullopt;
    }
    void advance(std::int64_t n_rows) {
        read_ += n_rows;
        if (!progress_) return;
        const std::string of = total_ ? fmt::format(" of {}", grouped(*total_)) : "";
        progress_(fmt::format("{}: {}{} rows read", survey_, grouped(read_), of));
    }

  private:
    std::string survey_;
    const Progress& progress_;
    std::optional<std::int64_t> total_ = 0;
    std::int64_t read_ = 0;
};

/// Degrees are understood; a unit that says otherwise deserves a word.
void warn_of_unit(const std::filesystem::path& path,
                  const std::string& column,
                  std::string unit,
                  std::vector<std::string>& warnings) {
    std::ranges::transform(
        unit, unit.begin(), [](unsigned char c) { return static_cast<char>(std::tolower(c)); });
    if (unit.empty() || unit.find("deg") != std::string::npos) return;
    warnings.push_back(fmt::format("{}: column {} states the unit `{}`; it is read as degrees",
                                   path.string(),
                                   column,
                                   unit));
}

/// All files are opened once before any is read, so that a fault of the last shows at once.
void look_at_files(const SurveyInput& survey,
                   const RowSelection& rows,
                   RowProgress& progress,
                   std::vector<std::string>& warnings) {
    for (const auto& path : survey.catalogue) {
        const auto reader = open_table(path, survey.table, rows.columns);
        progress.expect(reader->n_rows());
        for (const std::size_t column : {rows.lon, rows.lat})
            warn_of_unit(path, rows.columns[column], reader->unit_of(column), warnings);
    }
}

void count_rows(const Selection& selection,
                RowCounter& counter,
                CutTable& cuts,
                const Progress& progress) {
    const SurveyInput& survey = selection.input;
    ensure(!survey.catalogue.empty(), "bins with select have a catalogue");
    RowProgress row_progress(survey, progress);
    look_at_files(survey, selection.rows, row_progress, cuts.report.warnings);
    TableChunk chunk;
    for (const auto& path : survey.catalogue) {
        const auto reader = open_table(path, survey.table, selection.rows.columns);
        std::int64_t n_rows = 0;
        while (reader->next(chunk)) {
            counter.add(chunk, path, *reader);
            n_rows += chunk.n_rows();
            row_progress.advance(chunk.n_rows());
        }
        if (n_rows == 0) cuts.report.warnings.push_back(path.string() + ": it has no rows");
    }
    counter.refuse_offending_rows();
    std::ranges::move(counter.suspicions(), std::back_inserter(cuts.report.warnings));
}

/// An exclusion that removes nothing is mostly a disc smaller than the pixels.
void warn_of_idle_exclusions(const Selection& selection, CutTable& cuts) {
    const double width_deg = std::sqrt(selection.grid.solid_angle()) / radians_per_degree;
    for (std::size_t i = 0; i < selection.input.exclude.size(); ++i) {
        const CutLine& line = cuts.report.cuts[cuts.first_sky_cut + i];
        if (line.pixels_removed > 0) continue;
        cuts.report.warnings.push_back(fmt::format(
            "{} removes no pixel: no pixel centre that was still kept lies in it (pixels are "
            "{:.3g} deg wide), so no source is removed by it either; smaller regions are cut "
            "out by an exposure map",
            line.name,
            width_deg));
    }
}

/// Read at 16 points a pixel, a much finer map in another frame is sampled, not integrated.
void warn_of_sampled_exposures(const Selection& selection, CutTable& cuts) {
    std::vector<std::string> said;
    for (std::size_t bin = 0; bin < selection.input.bins.size(); ++bin) {
        for (const ExposureMap* map : selection.sky.maps_of_bin(bin)) {
            if (map->is_in_job_frame() || map->nside() <= 4 * selection.grid.nside()) continue;
            std::string warning = fmt::format(
                "{}: the exposure map (nside {}) is in another frame and read at 16 points of "
                "each pixel only; a map in the {} frame is averaged over all its pixels",
                map->path().string(),
                map->nside(),
                name_of(selection.frame));
            if (std::ranges::find(said, warning) == said.end()) said.push_back(warning);
        }
    }
    std::ranges::move(said, std::back_inserter(cuts.report.warnings));
}

SurveyCounts assembled(const Selection& selection,
                       const std::vector<BinTally>& tallies,
                       const CutTable& cuts) {
    SurveyCounts counts;
    counts.name = selection.input.name;
    counts.footprints = selection.sky.footprints();
    for (std::size_t bin = 0; bin < tallies.size(); ++bin) {
        const std::size_t footprint = selection.sky.footprint_of_bin(bin);
        counts.bins.push_back({selection.input.bins[bin].name,
                               footprint,
                               tallies[bin].on(counts.footprints[footprint])});
    }
    counts.cuts = cuts.finished();
    if (const auto warning =
            warning_of_lopsided_counts(counts, selection.grid, selection.frame))
        counts.cuts.warnings.push_back(*warning);
    return counts;
}

}  // namespace

SurveyCounts count_survey(const SurveyInput& survey,
                          const Pixelisation& grid,
                          Frame frame,
                          const Progress& progress,
                          const std::vector<Duplicates>& duplicates,
                          std::vector<Direction>* kept) {
    ensure(!survey.bins.empty(), "a survey has bins");
    const RowSelection rows(survey);
    const SkyCuts sky(survey, grid, frame);
    const Selection selection{survey, rows, sky, grid, frame};
    CutTable cuts(survey, rows, sky, duplicates);
    warn_of_idle_exclusions(selection, cuts);
    warn_of_sampled_exposures(selection, cuts);

    std::vector<BinTally> tallies;
    for (const BinInput& bin : survey.bins)
        tallies.emplace_back(fmt::format("survey {}, bin {}", survey.name, bin.name), grid);
    if (!rows.selecting_bins.empty()) {
        RowCounter counter(selection, cuts, tallies, duplicates, kept);
        count_rows(selection, counter, cuts, progress);
    } else if (!survey.catalogue.empty()) {
        cuts.report.warnings.emplace_back(
            "the catalogue is not read for counting: every bin has a count map");
    }
    for (std::size_t bin = 0; bin < survey.bins.size(); ++bin)
        if (survey.bins[bin].counts) count_map_sources(selection, bin, cuts, tallies[bin]);
    return assembled(selection, tallies, cuts);
}

}  // namespace deviascope
