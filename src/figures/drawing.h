// SPDX-License-Identifier: GPL-2.0-or-later
// FIGURES, inside: what is drawn, before it is known by which back-end
#pragma once

#include <array>
#include <cstdint>
#include <memory>
#include <optional>
#include <string>
#include <variant>
#include <vector>

#include "figures/colour.h"

namespace deviascope {

/// A place on the page in points (1/72 inch), x to the right, y down.
struct Point {
    double x = 0.0, y = 0.0;
};

struct Box {
    double left = 0.0, top = 0.0, right = 0.0, bottom = 0.0;
    double width() const { return right - left; }
    double height() const { return bottom - top; }
    bool overlaps(const Box& other) const {
        return left < other.right && other.left < right && top < other.bottom &&
               other.top < bottom;
    }
    Box grown(double margin) const {
        return {left - margin, top - margin, right + margin, bottom + margin};
    }
};

struct Polyline {
    std::vector<Point> point;
    bool closed = false;
};

/// The area between two lines of points, from left to right both.
inline Polyline area_between(const std::vector<Point>& upper, const std::vector<Point>& lower) {
    Polyline area{upper, true};
    area.point.insert(area.point.end(), lower.rbegin(), lower.rend());
    return area;
}

struct Stroke {
    double width = 0.8;
    Colour colour = palette::ink();
    std::vector<double> dash{};  ///< lengths on and off; empty: solid
};

/// Lines and areas; areas are filled by the even-odd rule, all pieces together.
struct Shape {
    std::vector<Polyline> pieces;
    std::optional<Colour> fill{};
    std::optional<Stroke> stroke{};
};

/// A circle.
struct Disc {
    Point centre;
    double radius = 1.0;
    std::optional<Colour> fill{};
    std::optional<Stroke> stroke{};
};

enum class Face { regular, semibold, italic };

/// A stretch of text in one face; `scale` and `rise` (in sizes, up) make sub- and superscripts.
struct Run {
    std::string text;
    Face face = Face::regular;
    double scale = 1.0;
    double rise = 0.0;
};
using Line = std::vector<Run>;

enum class Anchor { start, middle, end };

/// One line of text on its baseline.
struct Text {
    Point at;
    Line runs;
    double size = 7.0;
    Anchor anchor = Anchor::start;
    Colour colour = palette::ink();
    double turn_deg = 0.0;  ///< anticlockwise
    double halo = 0.0;      ///< width of an outline in the colour of the paper
};

/// A picture of width x height pixels, row by row from the top left, stretched over a box.
struct Raster {
    int width = 0, height = 0;
    std::vector<Colour> pixel;
};
struct Image {
    Box box;
    std::shared_ptr<const Raster> raster;
};

/// Everything inside is cut off at the edge of a closed line.
struct Clip {
    Polyline edge;
    std::vector<std::variant<Shape, Image>> content;
};

using Item = std::variant<Shape, Disc, Text, Image, Clip>;

/// A page: the display list that every back-end draws.
struct Drawing {
    double width = 0.0, height = 0.0;  ///< points
    std::vector<Item> items;

    void add(Item item) { items.push_back(std::move(item)); }
    void line(Point from, Point to, const Stroke& stroke) {
        add(Shape{{{{from, to}, false}}, std::nullopt, stroke});
    }
    void rectangle(const Box& box, Colour fill) { add(Shape{{edge_of(box)}, fill}); }
    static Polyline edge_of(const Box& box) {
        return {{{box.left, box.top},
                 {box.right, box.top},
                 {box.right, box.bottom},
                 {box.left, box.bottom}},
                true};
    }
};

}  // namespace deviascope
