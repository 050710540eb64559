// SPDX-License-Identifier: GPL-2.0-or-later
// FIGURES, inside: a map of the whole sky on a page
#pragma once

#include <Eigen/Core>
#include <span>
#include <string>
#include <vector>

#include "deviascope/sky/frame.h"
#include "deviascope/summary/direction_density.h"
#include "figures/drawing.h"
#include "figures/fonts.h"
#include "figures/mollweide.h"

namespace deviascope {

/// An edge of a region, as closed lines in the plane of a map; they may run beyond its rim.
using MapLines = std::vector<std::vector<Mollweide::Place>>;

/// A Mollweide map in a box twice as wide as high.
class SkyPanel {
  public:
    SkyPanel(double centre_lon_deg, const Box& box) : map_(centre_lon_deg), box_(box) {}

    const Mollweide& map() const { return map_; }
    const Box& box() const { return box_; }
    Point at(const Mollweide::Place& place) const;
    Point at(const Direction& direction) const { return at(map_.project(direction)); }
    std::vector<Polyline> at(const MapLines& lines) const;
    Polyline rim() const;

    void draw_ground(Drawing& drawing, Colour colour) const;
    /// Meridians every 60 and parallels every 30 degrees, rim, labels; returns the labels'
    /// boxes. Meridians have no label where an area of `covered` would lie over it.
    std::vector<Box> draw_graticule(Drawing& drawing,
                                    const Fonts& fonts,
                                    Frame frame,
                                    const std::vector<Polyline>& covered = {}) const;

    /// A picture of a function of the direction; `colour` may be transparent.
    template <class ColourAt>
    Image picture(int width, const ColourAt& colour) const;

  private:
    Mollweide map_;
    Box box_;
};

/// Where a density on the sphere exceeds each of some levels.
///
/// From the density itself on a grid of square cells in the map's own plane, 200 of them across
/// the region however small it is (two grids where the region lies on the seam). Beyond the rim
/// the grid carries on with the values at the rim, so that lines run off the map instead of
/// along it: cut them at the rim.
/// @param levels  falling; the last one's region holds the others'
/// @param draws   they tell where to look
std::vector<MapLines> regions_on(const Mollweide& map,
                                 const DirectionDensity& density,
                                 const std::vector<double>& levels,
                                 std::span<const Direction> draws,
                                 int threads);

/// Marks, told apart by shape as well as colour; index 0 is a disc, 1 a square, 2 a triangle,
/// 3 a lozenge, then again.
void draw_mark(Drawing& drawing, Point at, double size, std::size_t index, Colour fill);
/// Star of the reference direction.
void draw_star(Drawing& drawing, Point at, double size);

/// Puts labels where they do not collide with each other, with marks, or leave the page.
class LabelPlacer {
  public:
    explicit LabelPlacer(const Fonts& fonts, const Box& page) : fonts_(fonts), page_(page) {}
    void keep_free(const Box& box) { taken_.push_back(box); }
    /// Tries places around a mark, nearer ones first; returns false (nothing drawn) where all
    /// collide.
    bool place(Drawing& drawing, Point mark, const std::string& text);

  private:
    const Fonts& fonts_;
    Box page_;
    std::vector<Box> taken_;
};

/// Dots of a picture of that many points, at 190 dots per inch; even.
inline int dots_across(double points) {
    return 2 * static_cast<int>(points * 190.0 / 144.0);
}

template <class ColourAt>
Image SkyPanel::picture(int width, const ColourAt& colour) const {
    auto raster = std::make_shared<Raster>();
    raster->width = width;
    raster->height = width / 2;
    raster->pixel.reserve(static_cast<std::size_t>(width * raster->height));
    for (int row = 0; row < raster->height; ++row)
        for (int column = 0; column < width; ++column) {
            const Mollweide::Place place{4.0 * (column + 0.5) / width - 2.0,
                                         1.0 - 2.0 * (row + 0.5) / raster->height};
            // A pixel on the rim is coloured whole: the picture is cut at the rim.
            const bool is_far_out = 0.25 * place.x * place.x + place.y * place.y > 1.03;
            raster->pixel.push_back(is_far_out
                                        ? Colour{0, 0, 0, 0.0}
                                        : colour(*map_.direction_at(Mollweide::inside(place))));
        }
    return {box_, std::move(raster)};
}

}  // namespace deviascope
