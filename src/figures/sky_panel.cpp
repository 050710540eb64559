// SPDX-License-Identifier: GPL-2.0-or-later
#include "figures/sky_panel.h"

#include <fmt/format.h>

#include <algorithm>
#include <cmath>
#include <numbers>

#include "deviascope/core/parallel.h"
#include "deviascope/core/physical_constants.h"
#include "figures/axis.h"
#include "figures/contour.h"

namespace deviascope {
namespace {

Colour graticule_colour() {
    return palette::grey_text().with_alpha(0.45);
}

/// Whether a point is inside of areas, by the even-odd rule.
bool is_inside(const std::vector<Polyline>& areas, Point at) {
    bool inside = false;
    for (const Polyline& area : areas)
        for (std::size_t i = 0, j = area.point.size() - 1; i < area.point.size(); j = i++) {
            const Point a = area.point[i], b = area.point[j];
            if ((a.y > at.y) != (b.y > at.y) &&
                at.x < a.x + (at.y - a.y) / (b.y - a.y) * (b.x - a.x))
                inside = !inside;
        }
    return inside;
}

bool is_touched(const Box& box, const std::vector<Polyline>& areas) {
    const double y = 0.5 * (box.top + box.bottom);
    return is_inside(areas, {box.left, y}) || is_inside(areas, {box.right, y}) ||
           is_inside(areas, {0.5 * (box.left + box.right), y});
}

}  // namespace

Point SkyPanel::at(const Mollweide::Place& place) const {
    return {box_.left + 0.25 * (place.x + 2.0) * box_.width(),
            box_.top + 0.5 * (1.0 - place.y) * box_.height()};
}

Polyline SkyPanel::rim() const {
    Polyline line{{}, true};
    for (int step = 0; step < 180; ++step) {
        const double angle = 2.0 * step * radians_per_degree;
        line.point.push_back(at(Mollweide::Place{2.0 * std::cos(angle), std::sin(angle)}));
    }
    return line;
}

void SkyPanel::draw_ground(Drawing& drawing, Colour colour) const {
    drawing.add(Shape{{rim()}, colour, std::nullopt});
}

std::vector<Polyline> SkyPanel::at(const MapLines& lines) const {
    std::vector<Polyline> placed;
    for (const auto& line : lines) {
        placed.push_back({{}, true});
        for (const Mollweide::Place& place : line) placed.back().point.push_back(at(place));
    }
    return placed;
}

std::vector<Box> SkyPanel::draw_graticule(Drawing& drawing,
                                          const Fonts& fonts,
                                          Frame frame,
                                          const std::vector<Polyline>& covered) const {
    std::vector<Box> labels;
    Shape lines{{}, std::nullopt, Stroke{rule::graticule, graticule_colour()}};
    for (int step = -2; step <= 2; ++step) {
        Polyline meridian, parallel;
        const double lon = map_.centre_lon_deg() + 60.0 * step, lat = 30.0 * step;
        for (int lat_step = -45; lat_step <= 45; ++lat_step)
            meridian.point.push_back(at(direction_of(lon, 2.0 * lat_step)));
        for (const double end : {-179.99999, 179.99999})
            parallel.point.push_back(at(direction_of(map_.centre_lon_deg() + end, lat)));
        lines.pieces.push_back(std::move(meridian));
        lines.pieces.push_back(std::move(parallel));
        Text label = text_at(
            {}, plain_number(lat, 0) + "°", type::tick, Anchor::end, palette::grey_text());
        label.at = at(direction_of(map_.centre_lon_deg() + 179.99999, lat));
        label.at = {label.at.x - 3.0, label.at.y + 0.36 * type::tick};
        labels.push_back(box_of(label, fonts));
        drawing.add(label);
    }
    drawing.add(lines);
    drawing.add(Shape{{rim()}, std::nullopt, Stroke{rule::frame, palette::ink()}});
    for (int step = -2; step <= 2; ++step) {
        const double lon = std::fmod(map_.centre_lon_deg() + 60.0 * step + 720.0, 360.0);
        Text label = text_at(at(direction_of(lon, 0.0)),
                             plain_number(lon, 0) + "°",
                             type::tick,
                             Anchor::middle,
                             palette::grey_text());
        label.at.y += 1.25 * type::tick;
        label.halo = 1.6;
        const Box place = box_of(label, fonts);
        if (is_touched(place, covered)) continue;
        labels.push_back(place);
        drawing.add(label);
    }
    static constexpr const char* names[] = {"galactic l, b", "ICRS RA, Dec", "ecliptic λ, β"};
    const Text name = text_at({box_.left, box_.bottom},
                              names[static_cast<int>(frame)],
                              type::tick,
                              Anchor::start,
                              palette::grey_text());
    labels.push_back(box_of(name, fonts));
    drawing.add(name);
    return labels;
}

// ---- regions ----

namespace {

/// An upright rectangle in the map's plane.
struct Window {
    double left, right, bottom, top;
    void take(const Mollweide::Place& place) {
        left = std::min(left, place.x);
        right = std::max(right, place.x);
        bottom = std::min(bottom, place.y);
        top = std::max(top, place.y);
    }
};

std::vector<Window> windows_of(const std::vector<Mollweide::Place>& places) {
    constexpr Window none{9.0, -9.0, 9.0, -9.0};
    Window all = none, left = none, right = none;
    for (const Mollweide::Place& place : places) {
        all.take(place);
        (place.x < 0.0 ? left : right).take(place);
    }
    // Two pieces with more than half of the map between them: a region on the seam.
    const bool is_split = left.left <= 0.0 && right.right >= 0.0 &&
                          right.left - left.right > 0.5 * (all.right - all.left) &&
                          all.right - all.left > 0.5;
    return is_split ? std::vector<Window>{left, right} : std::vector<Window>{all};
}

/// Density on a grid of square cells over a window.
class WindowGrid {
  public:
    explicit WindowGrid(Window window) {
        // Draws end before the region does; small regions keep the same margin in proportion.
        const double margin =
            0.35 * std::max({window.right - window.left, window.top - window.bottom, 1e-7});
        left_ = std::max(window.left - margin, -2.1);
        bottom_ = std::max(window.bottom - margin, -1.05);
        const double width = std::min(window.right + margin, 2.1) - left_;
        const double height = std::min(window.top + margin, 1.05) - bottom_;
        constexpr double n_across = 200.0;
        cell_ = std::max(width, height) / n_across;
        n_columns_ = static_cast<Eigen::Index>(width / cell_) + 2;
        n_rows_ = static_cast<Eigen::Index>(height / cell_) + 2;
    }
    Mollweide::Place place(double column, double row) const {
        return {left_ + column * cell_, bottom_ + row * cell_};
    }
    Eigen::ArrayXXd values(const Mollweide& map,
                           const DirectionDensity& density,
                           int threads) const {
        Eigen::ArrayXXd field(n_rows_, n_columns_);
        parallel_for(std::size_t(n_rows_), threads, [&](std::size_t row) {
            for (Eigen::Index column = 0; column < n_columns_; ++column) {
                const auto inside = Mollweide::inside(place(double(column), double(row)));
                field(Eigen::Index(row), column) = density.at(*map.direction_at(inside));
            }
        });
        return field;
    }

  private:
    double left_, bottom_, cell_;
    Eigen::Index n_columns_, n_rows_;
};

}  // namespace

std::vector<MapLines> regions_on(const Mollweide& map,
                                 const DirectionDensity& density,
                                 const std::vector<double>& levels,
                                 std::span<const Direction> draws,
                                 int threads) {
    std::vector<Mollweide::Place> places;
    const std::size_t stride = draws.size() / 4000 + 1;
    for (std::size_t draw = 0; draw < draws.size(); draw += stride)
        if (density.at(draws[draw]) >= levels.back())
            places.push_back(map.project(draws[draw]));
    std::vector<MapLines> regions(levels.size());
    if (places.empty()) return regions;
    for (const Window& window : windows_of(places)) {
        const WindowGrid grid(window);
        const Eigen::ArrayXXd field = grid.values(map, density, threads);
        for (std::size_t level = 0; level < levels.size(); ++level)
            for (const Polyline& line : level_lines(field, levels[level])) {
                regions[level].emplace_back();
                for (const Point& point : line.point)
                    regions[level].back().push_back(grid.place(point.x, point.y));
            }
    }
    return regions;
}

// ---- marks and labels ----

namespace {

Polyline polygon(Point at, double radius, int corners, double first_deg) {
    Polyline line{{}, true};
    for (int corner = 0; corner < corners; ++corner) {
        const double angle = (first_deg + 360.0 * corner / corners) * radians_per_degree;
        line.point.push_back(
            {at.x + radius * std::cos(angle), at.y - radius * std::sin(angle)});
    }
    return line;
}

}  // namespace

void draw_mark(Drawing& drawing, Point at, double size, std::size_t index, Colour fill) {
    const Stroke edge{0.7, palette::paper()};
    switch (index % 4) {
        case 0:
            return drawing.add(Disc{at, 0.5 * size, fill, edge});
        case 1:
            return drawing.add(Shape{{polygon(at, 0.64 * size, 4, 45.0)}, fill, edge});
        case 2:
            return drawing.add(Shape{{polygon(at, 0.66 * size, 3, 90.0)}, fill, edge});
        default:
            return drawing.add(Shape{{polygon(at, 0.66 * size, 4, 0.0)}, fill, edge});
    }
}

void draw_star(Drawing& drawing, Point at, double size) {
    Polyline star{{}, true};
    for (int corner = 0; corner < 10; ++corner) {
        const double radius = corner % 2 == 0 ? 0.62 * size : 0.26 * size;
        const double angle = (90.0 + 36.0 * corner) * radians_per_degree;
        star.point.push_back(
            {at.x + radius * std::cos(angle), at.y - radius * std::sin(angle)});
    }
    drawing.add(Shape{{star}, palette::paper(), Stroke{0.8, palette::ink()}});
}

bool LabelPlacer::place(Drawing& drawing, Point mark, const std::string& text) {
    struct Offset {
        double x, y;
        Anchor anchor;
    };
    const double s = type::note;
    for (const double far : {6.0, 12.0, 20.0, 30.0, 42.0})
        for (const Offset& offset : {Offset{far, 0.35 * s, Anchor::start},
                                     Offset{-far, 0.35 * s, Anchor::end},
                                     Offset{0.0, -far, Anchor::middle},
                                     Offset{0.0, far + 0.7 * s, Anchor::middle},
                                     Offset{0.7 * far, -0.7 * far, Anchor::start},
                                     Offset{-0.7 * far, -0.7 * far, Anchor::end},
                                     Offset{0.7 * far, 0.7 * far + 0.6 * s, Anchor::start},
                                     Offset{-0.7 * far, 0.7 * far + 0.6 * s, Anchor::end}}) {
            Text label =
                text_at({mark.x + offset.x, mark.y + offset.y}, text, s, offset.anchor);
            const Box box = box_of(label, fonts_).grown(1.5);
            const bool on_page = box.left >= page_.left && box.right <= page_.right &&
                                 box.top >= page_.top && box.bottom <= page_.bottom;
            const bool is_free = std::none_of(
                taken_.begin(), taken_.end(), [&](const Box& b) { return b.overlaps(box); });
            if (!on_page || !is_free) continue;
            if (far > 12.0)
                drawing.line(mark,
                             {mark.x + 0.85 * offset.x, mark.y + 0.8 * offset.y},
                             {0.4, palette::ink()});
            label.halo = 2.2;
            drawing.add(label);
            taken_.push_back(box);
            return true;
        }
    return false;
}

}  // namespace deviascope
