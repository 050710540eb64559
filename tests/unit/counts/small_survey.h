// SPDX-License-Identifier: GPL-2.0-or-later
#pragma once

#include <limits>
#include <string>
#include <utility>
#include <vector>

#include "deviascope/core/error.h"
#include "deviascope/counts/count_sources.h"
#include "deviascope/sky/healpix_map.h"
#include "temporary_folder.h"

namespace deviascope::test {

constexpr double infinity = std::numeric_limits<double>::infinity();
constexpr double missing = std::numeric_limits<double>::quiet_NaN();

/// A survey in a folder of its own, in one frame throughout (ICRS), which a test fills.
struct SmallSurvey {
    TemporaryFolder folder;
    SurveyInput input;

    SmallSurvey() {
        input.name = "dunlin";
        input.columns = {{"lon", "RA"}, {"lat", "DEC"}, {"flux", "S"}, {"redshift", "Z"}};
    }
    /// Adds a catalogue with columns RA, DEC, S, Z.
    void add_catalogue(const std::string& name, const std::string& rows) {
        input.catalogue.push_back(folder.write(name, "RA,DEC,S,Z\n" + rows));
    }
    void add_bin(const std::string& name, std::vector<PropertyRange> select = {}) {
        input.bins.push_back({name, std::move(select), {}, {}});
    }
    std::filesystem::path add_map(const std::string& name,
                                  std::vector<double> value,
                                  std::optional<Frame> frame = Frame::icrs) const {
        int nside = 1;
        while (12 * nside * nside < static_cast<int>(value.size())) nside *= 2;
        write_healpix_map(folder / name, {nside, frame, std::move(value)}, "VALUE");
        return folder / name;
    }
    SurveyCounts count(int nside, Frame frame = Frame::icrs) const {
        return count_survey(input, Pixelisation(nside), frame, {});
    }
    /// The message with which the survey is refused.
    std::string refusal(int nside, Frame frame = Frame::icrs) const {
        try {
            count(nside, frame);
        } catch (const InputError& error) {
            return error.what();
        }
        return "accepted";
    }
};

/// Rows and pixels removed by the cut of that name; -1, -1 where there is no such line.
inline std::pair<std::int64_t, std::int64_t> removed(const SurveyCounts& counts,
                                                     const std::string& name) {
    for (const CutLine& line : counts.cuts.cuts)
        if (line.name == name) return {line.rows_removed, line.pixels_removed};
    return {-1, -1};
}

/// Counts of a bin over the full grid; 0 in pixels that are not kept.
inline std::vector<std::uint32_t> full_sky(const SurveyCounts& counts,
                                           std::size_t bin,
                                           std::int64_t n_pixels) {
    std::vector<std::uint32_t> out(static_cast<std::size_t>(n_pixels), 0);
    const Footprint& footprint = counts.footprints[counts.bins[bin].footprint];
    for (std::size_t i = 0; i < footprint.pixel.size(); ++i)
        out[static_cast<std::size_t>(footprint.pixel[i])] = counts.bins[bin].count[i];
    return out;
}

}  // namespace deviascope::test
