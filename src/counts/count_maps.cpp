// SPDX-License-Identifier: GPL-2.0-or-later
#include "deviascope/counts/count_maps.h"

#include <fmt/format.h>

#include <limits>
#include <system_error>

#include "deviascope/core/error.h"
#include "deviascope/sky/healpix_map.h"

namespace deviascope {

namespace {

namespace fs = std::filesystem;

constexpr double nothing = std::numeric_limits<double>::quiet_NaN();

/// Values of the pixels of a footprint over the full sky.
template <class Value>
HealpixMap full_sky(const Counts& counts,
                    const Footprint& footprint,
                    const std::vector<Value>& value,
                    double elsewhere) {
    const auto n_pixels = static_cast<std::size_t>(Pixelisation(counts.nside).n_pixels());
    HealpixMap map{counts.nside, counts.frame, std::vector<double>(n_pixels, elsewhere)};
    for (std::size_t i = 0; i < value.size(); ++i)
        map.value[static_cast<std::size_t>(footprint.pixel[i])] = static_cast<double>(value[i]);
    return map;
}

}  // namespace

std::array<fs::path, 2> names_of_count_maps(const std::string& survey, const std::string& bin) {
    const fs::path folder(survey);
    return {folder / (bin + "-counts.fits"), folder / (bin + "-exposure.fits")};
}

void write_count_maps(const Counts& counts, const fs::path& folder) {
    for (const SurveyCounts& survey : counts.surveys) {
        std::error_code failure;
        fs::create_directories(folder / survey.name, failure);
        if (failure)
            throw OutputError({(folder / survey.name).string(),
                               fmt::format("the folder cannot be made ({})", failure.message()),
                               "a folder that can be made or written to",
                               "name another one"});
        for (const BinCounts& bin : survey.bins) {
            const Footprint& footprint = survey.footprints[bin.footprint];
            const auto [counted, exposed] = names_of_count_maps(survey.name, bin.name);
            write_healpix_map(
                folder / counted, full_sky(counts, footprint, bin.count, nothing), "COUNTS");
            write_healpix_map(folder / exposed,
                              full_sky(counts, footprint, footprint.exposure, 0.0),
                              "EXPOSURE");
        }
    }
}

}  // namespace deviascope
