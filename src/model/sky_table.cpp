// SPDX-License-Identifier: GPL-2.0-or-later
#include "model/sky_table.h"

#include <fmt/format.h>

#include <algorithm>
#include <limits>
#include <numeric>

#include "deviascope/core/error.h"
#include "deviascope/sky/pixelisation.h"
#include "model/pixel_block.h"

namespace deviascope {
namespace {

std::size_t padded(std::size_t n) {
    return (n + block_size - 1) / block_size * block_size;
}

SkyTable make_sky(const Footprint& footprint, const Pixelisation& grid) {
    SkyTable sky;
    sky.footprint = &footprint;
    for (std::vector<double>* component : {&sky.x, &sky.y, &sky.z})
        component->resize(padded(footprint.pixel.size()));
    for (std::size_t p = 0; p < footprint.pixel.size(); ++p) {
        const Direction centre = grid.centre(footprint.pixel[p]);
        sky.x[p] = centre.x();
        sky.y[p] = centre.y();
        sky.z[p] = centre.z();
    }
    return sky;
}

/// The sky with these pixels, made where there is none.
SkyTable& sky_of(std::vector<SkyTable>& skies,
                 const Footprint& footprint,
                 const Pixelisation& grid) {
    const auto found = std::find_if(skies.begin(), skies.end(), [&](const SkyTable& sky) {
        return sky.footprint == &footprint || sky.footprint->pixel == footprint.pixel;
    });
    return found != skies.end() ? *found : skies.emplace_back(make_sky(footprint, grid));
}

std::size_t exposure_of(SkyTable& sky, const Footprint& footprint) {
    const auto found = std::find_if(
        sky.exposures.begin(), sky.exposures.end(), [&](const ExposureTable& exposure) {
            return exposure.footprint == &footprint ||
                   exposure.footprint->exposure == footprint.exposure;
        });
    if (found != sky.exposures.end())
        return static_cast<std::size_t>(found - sky.exposures.begin());
    ExposureTable& made = sky.exposures.emplace_back();
    made.footprint = &footprint;
    made.value = footprint.exposure;
    made.value.resize(sky.n_padded());
    made.sum = std::accumulate(made.value.begin(), made.value.end(), 0.0);
    return sky.exposures.size() - 1;
}

DipoleTable& dipole_of(SkyTable& sky, const BinTerm& term) {
    const auto found =
        std::find_if(sky.dipoles.begin(), sky.dipoles.end(), [&](const DipoleTable& dipole) {
            return dipole.intrinsic == term.intrinsic && dipole.bias_ratio == term.bias_ratio;
        });
    if (found != sky.dipoles.end()) return *found;
    DipoleTable& made = sky.dipoles.emplace_back();
    made.intrinsic = term.intrinsic;
    made.bias_ratio = term.bias_ratio;
    return made;
}

std::vector<std::int32_t> padded_counts(const SurveyCounts& survey,
                                        const BinCounts& bin,
                                        std::size_t n_padded) {
    constexpr std::uint32_t most = std::numeric_limits<std::int32_t>::max();
    std::vector<std::int32_t> count(n_padded, 0);
    for (std::size_t p = 0; p < bin.count.size(); ++p) {
        if (bin.count[p] > most)
            throw InputError({fmt::format("{}/{}", survey.name, bin.name),
                              fmt::format("a pixel holds {} sources", bin.count[p]),
                              fmt::format("at most {} are allowed", most),
                              "choose a larger nside"});
        count[p] = static_cast<std::int32_t>(bin.count[p]);
    }
    return count;
}

}  // namespace

std::size_t SkyTable::n_bins() const {
    std::size_t n = 0;
    for (const DipoleTable& dipole : dipoles) n += dipole.bins.size();
    return n;
}

std::vector<SkyTable> make_sky_tables(const Counts& counts, const ParameterSpace& space) {
    const Pixelisation grid(counts.nside);
    std::vector<SkyTable> skies;
    for (std::size_t t = 0; t < space.terms().size(); ++t) {
        const BinTerm& term = space.terms()[t];
        const SurveyCounts& survey = counts.surveys[term.survey];
        const BinCounts& bin = survey.bins[term.bin];
        const Footprint& footprint = survey.footprints[bin.footprint];
        SkyTable& sky = sky_of(skies, footprint, grid);
        BinTable table;
        table.term = static_cast<Eigen::Index>(t);
        table.weight = term.weight;
        table.exposure = exposure_of(sky, footprint);
        table.count = padded_counts(survey, bin, sky.n_padded());
        table.sources = static_cast<double>(bin.total());
        dipole_of(sky, term).bins.push_back(std::move(table));
    }
    return skies;
}

}  // namespace deviascope
