// SPDX-License-Identifier: GPL-2.0-or-later
#include <fmt/format.h>
#include <fmt/ranges.h>

#include <algorithm>
#include <cmath>

#include "deviascope/core/parallel.h"
#include "deviascope/core/physical_constants.h"
#include "deviascope/summary/plane_density.h"
#include "figures/contour.h"
#include "figures/scalar.h"

namespace deviascope {
namespace {

constexpr double left_labels = 30.0, bottom_labels = 26.0, gap = 4.0, narrowest = 46.0,
                 widest = 110.0;

std::size_t most_scalars(const FigureContext& context) {
    return static_cast<std::size_t>((context.width() - left_labels) / narrowest) - 1;
}

/// A pair of scalars: lines of its regions in data units, and the correlation.
struct Pair {
    std::vector<Polyline> region68, region95;
    double correlation = 0.0;
};

double correlation_of(const Scalar& x, const Scalar& y) {
    const auto n = static_cast<Eigen::Index>(x.values.size());
    const Eigen::Map<const Eigen::ArrayXd> a(x.values.data(), n), b(y.values.data(), n);
    const double covariance = ((a - x.estimate.mean) * (b - y.estimate.mean)).sum();
    return covariance / (static_cast<double>(n - 1) * x.estimate.sd * y.estimate.sd);
}

Pair pair_of(const Scalar& x, const Scalar& y) {
    Pair pair;
    pair.correlation = correlation_of(x, y);
    const PlaneDensity density(
        x.values, y.values, std::min(x.effective, y.effective), {x.support, y.support});
    if (!density.is_defined()) return pair;
    const auto region = [&](double probability) {
        auto lines = level_lines(density.grid(), density.level(probability));
        for (Polyline& line : lines)
            for (Point& point : line.point) {
                const Eigen::Vector2d at = density.pair_at(point.x, point.y);
                point = {at.x(), at.y()};
            }
        return lines;
    };
    pair.region68 = region(level68);
    pair.region95 = region(level95);
    return pair;
}

Interval range_of(const Scalar& scalar) {
    const Interval& ends = scalar.estimate.interval95;
    const double margin = 0.40 * (ends[1] - ends[0]);
    double lo = ends[0] - margin, hi = ends[1] + margin;
    if (scalar.support.lowest) lo = std::max(lo, *scalar.support.lowest);
    if (scalar.support.highest) hi = std::min(hi, *scalar.support.highest);
    return {lo, hi};
}

/// The whole figure: column 0 holds the ridges, columns 1 … n the scalars.
class JointPage {
  public:
    JointPage(const FigureContext& context,
              Sheet& sheet,
              double top,
              const std::vector<Scalar>& scalars)
        : context_(context),
          drawing_(sheet.drawing),
          top_(top),
          scalars_(scalars),
          cell_(std::min(widest,
                         (context.width() - left_labels - 6.0) / double(scalars.size() + 1))) {
        make_pairs();
    }

    double draw() {
        for (std::size_t row = 0; row < scalars_.size(); ++row) {
            draw_ridge(row);
            for (std::size_t column = 0; column < scalars_.size(); ++column) {
                if (column < row) draw_regions(row, column);
                if (column == row) draw_tile(row);
                if (column > row) draw_ellipse(row, column);
            }
        }
        const double bottom = top_ + double(scalars_.size()) * cell_;
        for (std::size_t column = 0; column + 1 < scalars_.size(); ++column) {
            const Box box = box_at(scalars_.size() - 1, column + 1);
            const Interval range = range_of(scalars_[column]);
            draw_bottom_axis(drawing_,
                             context_.fonts,
                             {range[0], range[1], box.left, box.right},
                             box.bottom,
                             {true, true, 0.0, true});
            drawing_.add(text_at({0.5 * (box.left + box.right), box.bottom + 21.0},
                                 axis_title(scalars_[column], box.width() + gap),
                                 type::tick,
                                 Anchor::middle));
        }
        return bottom + (scalars_.size() > 1 ? bottom_labels : 4.0);
    }

    const Pair& pair(std::size_t row, std::size_t column) const {
        return pairs_[row * scalars_.size() + column];
    }

  private:
    void make_pairs() {
        const std::size_t n = scalars_.size();
        pairs_.resize(n * n);
        parallel_for(n * n, context_.options.threads, [&](std::size_t place) {
            const std::size_t row = place / n, column = place % n;
            if (column < row) pairs_[place] = pair_of(scalars_[column], scalars_[row]);
        });
    }

    Box box_at(std::size_t row, std::size_t column) const {
        const double left = left_labels + double(column) * cell_ + 0.5 * gap;
        const double top = top_ + double(row) * cell_ + 0.5 * gap;
        return {left, top, left + cell_ - gap, top + cell_ - gap};
    }

    std::string axis_title(const Scalar& scalar, double room) const {
        return shortened(context_.fonts, scalar.words, type::tick, room);
    }

    Scale upwards(std::size_t row, const Box& box) const {
        const Interval range = range_of(scalars_[row]);
        return {range[0], range[1], box.bottom, box.top};
    }

    /// The row's density drawn sideways on the row's own axis.
    void draw_ridge(std::size_t row) {
        const Scalar& scalar = scalars_[row];
        const Box box = box_at(row, 0);
        const Scale up = upwards(row, box);
        const LineDensity& density = scalar.density;
        const Scale out{0.0, 1.08 * density.peak(), box.left, box.right};
        const auto turned = [&](const Interval& ends) {
            Polyline area{{}, true};
            area.point.push_back({out.at(0.0), up.at(ends[0])});
            for (int step = 0; step <= 100; ++step) {
                const double value = ends[0] + (ends[1] - ends[0]) * step / 100.0;
                area.point.push_back({out.at(density.at(value)), up.at(value)});
            }
            area.point.push_back({out.at(0.0), up.at(ends[1])});
            return area;
        };
        Clip clip{Drawing::edge_of(box), {}};
        clip.content.push_back(
            Shape{{turned(scalar.estimate.interval95)}, palette::fill95(scalar.series)});
        clip.content.push_back(
            Shape{{turned(scalar.estimate.interval68)}, palette::fill68(scalar.series)});
        Polyline curve;
        for (std::size_t node = 0; node < density.place.size(); node += 2)
            curve.point.push_back({out.at(density.density[node]), up.at(density.place[node])});
        clip.content.push_back(
            Shape{{curve}, std::nullopt, Stroke{rule::curve, palette::series(scalar.series)}});
        drawing_.add(std::move(clip));
        draw_left_axis(drawing_, context_.fonts, up, box.left, {true, true, 0.0, true});
    }

    void draw_regions(std::size_t row, std::size_t column) {
        const Box box = box_at(row, column + 1);
        const Interval range = range_of(scalars_[column]);
        const Scale across{range[0], range[1], box.left, box.right};
        const Scale up = upwards(row, box);
        const std::size_t series = scalars_[row].series;
        const auto placed = [&](std::vector<Polyline> lines) {
            for (Polyline& line : lines)
                for (Point& point : line.point) point = {across.at(point.x), up.at(point.y)};
            return lines;
        };
        const auto region68 = placed(pair(row, column).region68);
        const auto region95 = placed(pair(row, column).region95);
        const Colour colour = palette::series(series);
        Clip clip{Drawing::edge_of(box), {}};
        clip.content.push_back(
            Shape{region95, palette::fill95(series), Stroke{rule::outline95, colour}});
        clip.content.push_back(
            Shape{region68, palette::fill68(series), Stroke{rule::outline68, colour}});
        drawing_.add(std::move(clip));
        drawing_.line({box.left, box.bottom}, {box.right, box.bottom}, {0.5, palette::ink()});
        drawing_.line({box.left, box.bottom}, {box.left, box.top}, {0.5, palette::ink()});
    }

    /// Symbol, value and unit.
    void draw_tile(std::size_t row) {
        const Scalar& scalar = scalars_[row];
        const Box box = box_at(row, row + 1);
        drawing_.rectangle(box, palette::tile());
        const double middle = 0.5 * (box.left + box.right);
        const double size = std::clamp(0.24 * box.height(), 8.0, type::symbol);
        double y = box.top + 0.30 * box.height() + 0.3 * size;
        Text symbol = text_at({middle, y}, "", size, Anchor::middle);
        symbol.runs = scalar.symbol;
        drawing_.add(symbol);
        const std::string owner =
            shortened(context_.fonts, scalar.words, 5.5, box.width() - 2.0);
        y = box.top + 0.56 * box.height();
        drawing_.add(text_at({middle, y}, owner, 5.5, Anchor::middle, palette::grey_text()));
        Text value = text_at({middle, y + 0.19 * box.height()}, "", type::tick, Anchor::middle);
        value.runs = scalar.value_text();
        while (context_.fonts.width(value.runs, value.size) > box.width() - 2.0 &&
               value.size > 4.0)
            value.size -= 0.25;
        drawing_.add(value);
        drawing_.add(text_at({middle, box.bottom - 0.07 * box.height()},
                             scalar.unit,
                             5.5,
                             Anchor::middle,
                             palette::grey_text()));
    }

    /// The ellipse of a standardised Gaussian of this correlation, and the number.
    void draw_ellipse(std::size_t row, std::size_t column) {
        const double rho = pair(column, row).correlation;
        const Box box = box_at(row, column + 1);
        const Point centre{0.5 * (box.left + box.right), 0.5 * (box.top + box.bottom)};
        const double radius = 0.36 * box.width();
        Polyline ellipse{{}, true};
        for (int step = 0; step < 72; ++step) {
            const double angle = 5.0 * step * radians_per_degree;
            const double shift = 0.5 * std::acos(std::clamp(rho, -1.0, 1.0));
            ellipse.point.push_back({centre.x + radius * std::cos(angle + shift),
                                     centre.y - radius * std::cos(angle - shift)});
        }
        drawing_.add(
            Shape{{ellipse}, strongly_diverging(rho), Stroke{0.5, palette::grey_text()}});
        Text number = text_at({centre.x, centre.y + 0.36 * type::tick},
                              plain_number(rho, 2),
                              type::tick,
                              Anchor::middle);
        number.colour = Colour{28, 31, 42};  // on a light fill, also on a dark page
        if (std::abs(rho) > 0.7) {           // a slim ellipse is no ground to read on
            number.at.y = box.bottom - 1.0;
            number.colour = palette::ink();
        }
        drawing_.add(number);
    }

    const FigureContext& context_;
    Drawing& drawing_;
    double top_;
    const std::vector<Scalar>& scalars_;
    double cell_;
    std::vector<Pair> pairs_;
};

/// Ends of the intervals, the median, and the density along the scalar.
void add_numbers(CsvText& csv, const Scalar& scalar) {
    const auto add = [&](const char* what, double value, double density) {
        csv.text(what).text(scalar.name).text("").text(scalar.unit).text("").text("");
        csv.number(value).number(density);
        csv.end_row();
    };
    const LineDensity& density = scalar.density;
    for (const Mark& mark : marks_of(scalar))
        add(mark.name, mark.value, density.at(mark.value));
    for (std::size_t node = 0; node < density.place.size(); ++node)
        add("density", density.place[node], density.density[node]);
}

std::string csv_of(const JointPage& page, const std::vector<Scalar>& scalars) {
    // Regions of pairs, then correlations, then each scalar's own density and numbers.
    CsvText csv({"what", "x", "y", "unit_x", "unit_y", "piece", "value_x", "value_y"});
    const auto add = [&](const Scalar& x,
                         const Scalar& y,
                         const std::vector<Polyline>& lines,
                         const char* percent) {
        for (std::size_t piece = 0; piece < lines.size(); ++piece)
            for (const Point& point : lines[piece].point) {
                csv.text(percent).text(x.name).text(y.name).text(x.unit).text(y.unit);
                csv.number(double(piece + 1)).number(point.x).number(point.y);
                csv.end_row();
            }
    };
    for (std::size_t row = 0; row < scalars.size(); ++row)
        for (std::size_t column = 0; column < row; ++column) {
            add(scalars[column],
                scalars[row],
                page.pair(row, column).region68,
                "region 68.27 %");
            add(scalars[column],
                scalars[row],
                page.pair(row, column).region95,
                "region 95.45 %");
            csv.text("correlation").text(scalars[column].name).text(scalars[row].name);
            csv.text("").text("").text("").number(page.pair(row, column).correlation).text("");
            csv.end_row();
        }
    for (const Scalar& scalar : scalars) add_numbers(csv, scalar);
    return csv.str();
}

Sheet joint_sheet(const FigureContext& context,
                  const std::string& name,
                  const std::string& title,
                  const std::vector<Scalar>& scalars) {
    auto [sheet, top] = begin_sheet(context, name, title);
    JointPage page(context, sheet, top, scalars);
    const double bottom = page.draw();
    std::vector<std::string> words;
    for (const Scalar& scalar : scalars)
        words.push_back(scalar.words + " " + scalar.value_words());
    for (std::size_t row = 0; row < scalars.size(); ++row)
        for (std::size_t column = 0; column < row; ++column)
            if (std::abs(page.pair(row, column).correlation) >= 0.3)
                words.push_back(
                    fmt::format("correlation of {} and {} {}",
                                scalars[column].words,
                                scalars[row].words,
                                plain_number(page.pair(row, column).correlation, 2)));
    sheet.alternative = fmt::format(
        "Joint posterior of {} parameters: {}.", scalars.size(), fmt::join(words, "; "));
    sheet.reading_aid =
        "Left: each parameter's density on its row's axis. Below the diagonal: areas that hold "
        "68 % and 95 % of a pair. Above it: the pair's correlation as an ellipse and a number.";
    sheet.csv = csv_of(page, scalars);
    return end_sheet(context, std::move(sheet), bottom);
}

/// The components of a vector that vary.
std::vector<Scalar> components_of(const FigureContext& context, const VectorSeries& series) {
    std::vector<Scalar> scalars;
    if (!series.parameter->amplitude_free) return scalars;
    const Eigen::Index first = series.parameter->first;
    if (!series.parameter->direction_free)
        return {scalar_named(context, series.parameter->name + ".amplitude")};
    for (Eigen::Index component = 0; component < 3; ++component)
        scalars.push_back(scalar_named(
            context, context.source.chain.parameters[std::size_t(first + component)].name));
    return scalars;
}

std::vector<Scalar> chosen_scalars(const FigureContext& context) {
    const auto& names = context.options.parameters;
    if (names.size() > most_scalars(context))
        throw UsageError({"--parameters",
                          fmt::format("{} parameters", names.size()),
                          fmt::format("up to {} fit into this width", most_scalars(context)),
                          "name fewer, or give --width 180mm"});
    std::vector<Scalar> scalars;
    for (const std::string& name : names) scalars.push_back(scalar_named(context, name));
    return scalars;
}

}  // namespace

std::vector<Sheet> joint_sheets(const FigureContext& context) {
    if (!context.options.parameters.empty())
        return {joint_sheet(context, "joint", "Joint posterior", chosen_scalars(context))};
    std::vector<Scalar> all;
    std::vector<Sheet> apart;
    const auto series = vector_series(context.source);
    const std::size_t most = most_scalars(context);
    const std::vector<Scalar> velocity = components_of(context, series.front());
    for (const VectorSeries& one : series) {
        std::vector<Scalar> own = one.is_velocity() ? velocity : components_of(context, one);
        all.insert(all.end(), own.begin(), own.end());
    }
    if (all.empty()) return {};
    if (all.size() <= most)
        return {joint_sheet(context, "joint", "Joint posterior of the vectors", all)};
    // Too many for a page: the velocity with each dipole in turn, or each vector alone.
    for (const VectorSeries& one : series) {
        std::vector<Scalar> own = components_of(context, one);
        if (own.empty()) continue;
        const bool with_velocity =
            !one.is_velocity() && !velocity.empty() && velocity.size() + own.size() <= most;
        if (one.is_velocity() && velocity.size() + 3 <= most) continue;
        if (with_velocity) own.insert(own.begin(), velocity.begin(), velocity.end());
        apart.push_back(joint_sheet(
            context,
            "joint-" + one.summary->name,
            with_velocity ? fmt::format("Joint posterior of velocity and {}", one.name)
                          : fmt::format("Joint posterior of the {}", one.name),
            own));
    }
    return apart;
}

}  // namespace deviascope
