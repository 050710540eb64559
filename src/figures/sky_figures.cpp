// SPDX-License-Identifier: GPL-2.0-or-later
#include "figures/sky_figures.h"

#include <fmt/format.h>

#include <algorithm>
#include <cmath>

#include "deviascope/core/physical_constants.h"
#include "deviascope/summary/draw_values.h"

namespace deviascope {

VectorRegions regions_of(const FigureContext& context,
                         const Mollweide& map,
                         const VectorSeries& series) {
    VectorRegions regions{series, {}, {}};
    const auto& density = context.source.directions[series.index];
    if (!density) return regions;
    const auto place = std::pair{series.index, static_cast<int>(map.centre_lon_deg())};
    auto known = context.regions->find(place);
    if (known == context.regions->end()) {
        const Directions directions =
            directions_of(rows_of(context.source.chain.draws), series.parameter->first);
        known = context.regions
                    ->emplace(place,
                              regions_on(map,
                                         *density,
                                         {density->level(level68), density->level(level95)},
                                         directions.unit,
                                         context.options.threads))
                    .first;
    }
    regions.region68 = known->second[0];
    regions.region95 = known->second[1];
    return regions;
}

std::optional<Direction> pointing_of(const FigureContext& context, const VectorSeries& series) {
    const auto& place = series.summary->icrs;
    if (!place) return std::nullopt;
    return rotation(Frame::icrs, context.source.summary.frame) *
           direction_of(place->lon_deg, place->lat_deg);
}

bool is_dispersed(const FigureContext& context, std::size_t survey) {
    return std::ranges::any_of(context.source.space.terms(), [&](const BinTerm& term) {
        return term.survey == survey && term.dispersion != 1.0;
    });
}

double quiet_centre(const FigureContext& context, const std::vector<VectorSeries>& series) {
    std::size_t near_seam = 0, near_middle = 0;
    for (const VectorSeries& one : series) {
        if (!one.parameter->direction_free) continue;
        const Directions directions =
            directions_of(rows_of(context.source.chain.draws), one.parameter->first);
        const std::size_t stride = directions.unit.size() / 2000 + 1;
        for (std::size_t draw = 0; draw < directions.unit.size(); draw += stride) {
            const double lon = std::atan2(directions.unit[draw].y(), directions.unit[draw].x());
            near_seam += std::cos(lon) < -0.94 ? 1 : 0;  // within 20 deg
            near_middle += std::cos(lon) > 0.94 ? 1 : 0;
        }
    }
    return near_seam > near_middle ? 180.0 : 0.0;
}

std::string place_in_words(const LonLat& place, Frame frame) {
    static constexpr const char* names[] = {"l, b", "RA, Dec", "λ, β"};
    return fmt::format("({}) = ({}°, {}°)",
                       names[static_cast<int>(frame)],
                       plain_number(place.lon_deg >= 359.95 ? 0.0 : place.lon_deg, 1),
                       plain_number(place.lat_deg, 1));
}

void add_edges(CsvText& csv, const Mollweide& map, const VectorRegions& regions) {
    const auto add = [&](const MapLines& region, const char* percent) {
        for (std::size_t piece = 0; piece < region.size(); ++piece)
            for (const Mollweide::Place& on_map : region[piece]) {
                const LonLat place = lon_lat_of(*map.direction_at(Mollweide::inside(on_map)));
                csv.text(regions.series.parameter->name)
                    .text(percent)
                    .number(double(piece + 1))
                    .number(place.lon_deg)
                    .number(place.lat_deg);
                csv.end_row();
            }
    };
    add(regions.region68, "region 68.27 %");
    add(regions.region95, "region 95.45 %");
}

}  // namespace deviascope
