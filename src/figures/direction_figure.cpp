// SPDX-License-Identifier: GPL-2.0-or-later
#include <fmt/format.h>
#include <fmt/ranges.h>

#include <algorithm>

#include "figures/sky_figures.h"
#include "summary/rounding.h"

namespace deviascope {
namespace {

/// Regions wider than that may lie over the meridians' labels: too many would be lost.
constexpr double widest_unlabelled_deg2 = 4000.0;

/// How many surveys have kept each pixel.
std::vector<int> times_covered(const Counts& counts) {
    std::vector<int> covered(std::size_t(Pixelisation(counts.nside).n_pixels()), 0);
    for (const SurveyCounts& survey : counts.surveys) {
        std::vector<bool> kept(covered.size(), false);
        for (const Footprint& footprint : survey.footprints)
            for (const std::int64_t pixel : footprint.pixel) kept[std::size_t(pixel)] = true;
        for (std::size_t pixel = 0; pixel < covered.size(); ++pixel)
            covered[pixel] += kept[pixel] ? 1 : 0;
    }
    return covered;
}

/// Grey where no survey looked, lighter where only some did.
Clip masks_on(const SkyPanel& panel, const Counts& counts) {
    const Pixelisation grid(counts.nside);
    const std::vector<int> covered = times_covered(counts);
    const int n_surveys = static_cast<int>(counts.surveys.size());
    const Colour grey = oklch(0.60, 0.008, 276);
    const auto colour = [&](const Direction& direction) {
        const int times = covered[std::size_t(grid.pixel_at(direction))];
        if (times == n_surveys) return grey.with_alpha(0.0);
        return grey.with_alpha(times == 0 ? 0.36 : 0.17);
    };
    return {panel.rim(), {panel.picture(dots_across(panel.box().width()), colour)}};
}

void draw_regions(Drawing& drawing,
                  const SkyPanel& panel,
                  std::vector<const VectorRegions*> regions) {
    // The widest first, so that none hides another; all outlines after all fills.
    std::stable_sort(regions.begin(), regions.end(), [](const auto* a, const auto* b) {
        const auto area = [](const VectorRegions* one) {
            return one->series.summary->region95 ? one->series.summary->region95->area_deg2
                                                 : 0.0;
        };
        return area(a) > area(b);
    });
    Clip clip{panel.rim(), {}};
    for (const VectorRegions* one : regions) {
        const Colour colour = palette::series(one->series.index);
        clip.content.push_back(Shape{panel.at(one->region95), colour.with_alpha(0.22)});
        clip.content.push_back(Shape{panel.at(one->region68), colour.with_alpha(0.40)});
    }
    for (const VectorRegions* one : regions) {
        const Colour colour = palette::series(one->series.index);
        const std::vector<double> dash =
            one->series.index >= 4 ? std::vector<double>{3.0, 1.5} : std::vector<double>{};
        clip.content.push_back(Shape{
            panel.at(one->region95), std::nullopt, Stroke{rule::outline95, colour, dash}});
        clip.content.push_back(Shape{
            panel.at(one->region68), std::nullopt, Stroke{rule::outline68, colour, dash}});
    }
    drawing.add(std::move(clip));
}

struct Marked {
    Point at;
    std::string label;
};

/// Middle of the largest of several areas (area and middle by the shoelace formula).
Point middle_of_largest(const std::vector<Polyline>& areas) {
    Point middle;
    double largest = 0.0;
    for (const Polyline& area : areas) {
        double twice = 0.0;
        Point sum;
        for (std::size_t i = 0, j = area.point.size() - 1; i < area.point.size(); j = i++) {
            const Point a = area.point[j], b = area.point[i];
            const double cross = a.x * b.y - b.x * a.y;
            twice += cross;
            sum = {sum.x + (a.x + b.x) * cross, sum.y + (a.y + b.y) * cross};
        }
        if (std::abs(twice) <= largest) continue;
        largest = std::abs(twice);
        middle = {sum.x / (3.0 * twice), sum.y / (3.0 * twice)};
    }
    return middle;
}

/// A vector without a mean direction whose regions are small has several of them.
bool has_lobes(const VectorRegions& one) {
    return one.is_on_map() && !one.region68.empty() &&
           one.series.summary->region95->area_deg2 < widest_unlabelled_deg2;
}

/// Whether labels leave `intrinsic dipole of` out: many of them on a narrow map.
bool has_short_labels(const FigureContext& context, std::size_t n_vectors) {
    return n_vectors > 3 && context.width() < 400.0;
}

/// Marks at mean directions, then all labels around them; returns those that found no room.
std::vector<std::string> draw_marks(const FigureContext& context,
                                    Drawing& drawing,
                                    const SkyPanel& panel,
                                    const std::vector<VectorRegions>& regions,
                                    const std::vector<Box>& labels) {
    LabelPlacer placer(context.fonts,
                       {2.0, panel.box().top - 2.0, drawing.width - 2.0, panel.box().bottom});
    for (const Box& label : labels) placer.keep_free(label);
    std::vector<Marked> marks;
    const bool is_short = has_short_labels(context, regions.size());
    for (const VectorRegions& each : regions) {
        const VectorSeries& one = each.series;
        const auto pointing = pointing_of(context, one);
        if (!pointing && !has_lobes(each)) continue;
        std::string name = is_short && !one.is_velocity() ? one.summary->name : one.name;
        if (!one.parameter->direction_free) name += " (fixed)";
        name = shortened(context.fonts, name, type::note, 0.4 * drawing.width);
        if (pointing) {
            const Point at = panel.at(*pointing);
            draw_mark(drawing, at, 5.0, one.index, palette::series(one.index));
            marks.push_back({at, name});
        } else {
            marks.push_back({middle_of_largest(panel.at(each.region68)), name});
        }
    }
    if (!context.source.cmb_velocity.isZero(0.0)) {
        const Point at = panel.at(Direction(context.source.cmb_velocity.normalized()));
        draw_star(drawing, at, 7.0);
        marks.push_back({at, "CMB dipole"});
    }
    for (const Marked& mark : marks)
        placer.keep_free(Box{mark.at.x, mark.at.y, mark.at.x, mark.at.y}.grown(4.0));
    std::vector<std::string> unplaced;
    for (const Marked& mark : marks)
        if (!placer.place(drawing, mark.at, mark.label)) unplaced.push_back(mark.label);
    return unplaced;
}

/// Mean directions and the reference.
void add_marks(CsvText& csv,
               const FigureContext& context,
               const std::vector<VectorSeries>& series) {
    const auto add = [&](const std::string& name, const char* what, const Direction& at) {
        const LonLat place = lon_lat_of(at);
        csv.text(name).text(what).text("").number(place.lon_deg).number(place.lat_deg);
        csv.end_row();
    };
    for (const VectorSeries& one : series)
        if (const auto pointing = pointing_of(context, one))
            add(one.parameter->name, "mean", *pointing);
    if (!context.source.cmb_velocity.isZero(0.0))
        add("CMB dipole", "reference", context.source.cmb_velocity.normalized());
}

std::string words_of(const FigureContext& context, const VectorSeries& series) {
    const Frame frame = context.source.summary.frame;
    const auto pointing = pointing_of(context, series);
    std::string text = series.name;
    text += pointing ? " towards " + place_in_words(lon_lat_of(*pointing), frame)
                     : std::string(" without a mean direction");
    const VectorSummary& summary = *series.summary;
    if (summary.region68 && summary.region95)
        text += fmt::format(", 68 % within {} and 95 % within {} square degrees",
                            short_number(summary.region68->area_deg2),
                            short_number(summary.region95->area_deg2));
    return text;
}

/// Swatches of the two regions, the mask and the star.
double draw_key(const FigureContext& context,
                Drawing& drawing,
                const std::vector<VectorSeries>& series,
                double top) {
    struct Entry {
        Colour fill;
        std::string words;
    };
    const Colour colour = palette::series(series.front().index);
    std::vector<Entry> entries{{colour.with_alpha(0.53), "68 %"},
                               {colour.with_alpha(0.22), "95 % of the posterior"}};
    const Colour grey = oklch(0.60, 0.008, 276);
    entries.push_back({grey.with_alpha(0.36), "not observed"});
    if (context.source.chain.counts.surveys.size() > 1)
        entries.push_back({grey.with_alpha(0.17), "by some surveys only"});
    double x = 8.0, y = top + 4.0;
    for (const Entry& entry : entries) {
        const double width = 14.0 + context.fonts.width(entry.words, type::note) + 12.0;
        if (x > 8.0 && x + width > drawing.width) {
            x = 8.0;
            y += 1.5 * type::note;
        }
        drawing.add(Shape{{Drawing::edge_of({x, y, x + 10.0, y + 6.0})},
                          entry.fill,
                          Stroke{0.4, palette::grey_text()}});
        drawing.add(text_at({x + 14.0, y + 5.8}, entry.words, type::note));
        x += width;
    }
    return y + 8.0;
}

/// Vectors that the map cannot show, in words.
std::vector<std::string> notes_of(const FigureContext& context,
                                  const std::vector<VectorSeries>& series) {
    std::vector<std::string> notes;
    if (has_short_labels(context, series.size()))
        notes.emplace_back("Names of surveys stand for their intrinsic dipoles.");
    for (const VectorSeries& one : series) {
        if (one.summary->mean.isZero(0.0) && !one.parameter->amplitude_free)
            notes.push_back(fmt::format("{}: fixed at zero.", one.name));
        else if (one.parameter->direction_free && !pointing_of(context, one))
            notes.push_back(fmt::format(
                "{}: no mean direction; its regions are those of the whole posterior.",
                one.name));
        else if (one.summary->region68 && one.summary->region68->area_deg2 < 1.0)
            notes.push_back(
                fmt::format("{}: its region of {:.2g} square degrees is smaller "
                            "than its mark.",
                            one.name,
                            one.summary->region68->area_deg2));
    }
    return notes;
}

}  // namespace

std::vector<Sheet> direction_sheets(const FigureContext& context) {
    const auto series = vector_series(context.source);
    auto [sheet, top] = begin_sheet(context, "directions", "Directions on the sky");
    const double width = context.width();
    const Box box{22.0, top + 2.0, width - 6.0, top + 2.0 + 0.5 * (width - 28.0)};
    const SkyPanel panel(quiet_centre(context, series), box);
    panel.draw_ground(sheet.drawing, palette::plain_sky());
    sheet.drawing.add(masks_on(panel, context.source.chain.counts));
    std::vector<VectorRegions> regions;
    for (const VectorSeries& one : series)
        regions.push_back(regions_of(context, panel.map(), one));
    std::vector<const VectorRegions*> shown;
    CsvText csv({"vector", "what", "piece", "lon_deg", "lat_deg"});
    for (const VectorRegions& one : regions)
        if (one.is_on_map()) {
            shown.push_back(&one);
            add_edges(csv, panel.map(), one);
        }
    add_marks(csv, context, series);
    std::vector<Polyline> covered;
    for (const VectorRegions* one : shown) {
        if (one->series.summary->region95->area_deg2 > widest_unlabelled_deg2) continue;
        const std::vector<Polyline> areas = panel.at(one->region95);
        covered.insert(covered.end(), areas.begin(), areas.end());
    }
    const std::vector<Box> labels = panel.draw_graticule(
        sheet.drawing, context.fonts, context.source.summary.frame, covered);
    draw_regions(sheet.drawing, panel, shown);
    const auto unplaced = draw_marks(context, sheet.drawing, panel, regions, labels);
    double bottom = draw_key(context, sheet.drawing, series, box.bottom + 4.0);
    std::vector<std::string> notes = notes_of(context, series);
    if (!unplaced.empty())
        notes.push_back(fmt::format("No room for the label of {}.", fmt::join(unplaced, ", ")));
    bottom = draw_notes(sheet.drawing, context.fonts, notes, 8.0, bottom, palette::grey_text());
    std::vector<std::string> words;
    for (const VectorSeries& one : series) words.push_back(words_of(context, one));
    sheet.alternative = fmt::format("Map of the whole sky in {} coordinates. {}.",
                                    name_of(context.source.summary.frame),
                                    fmt::join(words, "; "));
    sheet.reading_aid =
        "Darker and lighter areas hold 68 % and 95 % of the posterior of each direction, marks "
        "are mean directions; equal areas on the map are equal areas of sky, seen from inside.";
    sheet.csv = csv.str();
    return {end_sheet(context, std::move(sheet), bottom)};
}

}  // namespace deviascope
