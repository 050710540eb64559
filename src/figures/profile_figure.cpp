// SPDX-License-Identifier: GPL-2.0-or-later
#include <fmt/format.h>

#include <algorithm>
#include <boost/math/special_functions/gamma.hpp>
#include <boost/random/poisson_distribution.hpp>
#include <cmath>
#include <numeric>

#include "deviascope/core/parallel.h"
#include "deviascope/core/physical_constants.h"
#include "deviascope/model/expected_counts.h"
#include "deviascope/summary/draw_values.h"
#include "figures/sky_figures.h"
#include "summary/rounding.h"

namespace deviascope {
namespace {

constexpr std::size_t n_rings = 12;
constexpr Eigen::Index n_rows_drawn = 400;  // of the chain
constexpr std::size_t n_repeats = 25;       // of the noise, for each

/// A ring of sky about the apex: part of a bin's kept pixels, all rings of equal exposed area.
struct Ring {
    double angle_deg = 0.0;  ///< exposed mean
    double area_deg2 = 0.0;  ///< at full exposure
    double counted = 0.0;
    double expected = 0.0;        ///< at the mean row
    Interval counted68{};         ///< of the Poisson mean, from the count
    Interval band68{}, band95{};  ///< of counts that the posterior predicts
};

/// Kept pixels of a ring, gathered in coarser cells: total exposure and exposed mean direction.
struct Cell {
    Direction direction;
    double exposure;
};

struct Profile {
    const BinTerm* term = nullptr;
    std::string name;
    std::vector<Ring> rings;
    std::vector<std::vector<Cell>> cells;  ///< per ring
};

/// Ends of the interval for a Poisson mean from a count: exact where Poisson.
/// Source: Garwood 1936, Biometrika 28, 437 (as gamma quantiles).
Interval poisson_interval(double count, double probability) {
    const double tail = 0.5 * (1.0 - probability);
    return {count > 0.0 ? boost::math::gamma_p_inv(count, tail) : 0.0,
            boost::math::gamma_q_inv(count + 1.0, tail)};
}

std::vector<std::size_t> places_by_angle(const Footprint& footprint,
                                         const Pixelisation& grid,
                                         const Direction& apex) {
    std::vector<double> cosine;
    for (const std::int64_t pixel : footprint.pixel)
        cosine.push_back(grid.centre(pixel).dot(apex));
    std::vector<std::size_t> places(cosine.size());
    std::iota(places.begin(), places.end(), 0);
    std::stable_sort(places.begin(), places.end(), [&](std::size_t a, std::size_t b) {
        return cosine[a] > cosine[b];
    });
    return places;
}

/// Cells of nside 16 (3.7 deg): the expectation is so smooth that their mean directions stand
/// for their pixels (relative error: half of cell size squared times dipole, below 1e-5).
std::vector<Cell> cells_of(const Counts& counts,
                           const Footprint& footprint,
                           const std::vector<std::size_t>& places) {
    const Pixelisation fine(counts.nside), coarse(std::min(counts.nside, 16));
    struct Sum {
        Eigen::Vector3d direction = Eigen::Vector3d::Zero();
        double exposure = 0.0;
    };
    std::vector<Sum> sums(std::size_t(coarse.n_pixels()));
    for (const std::size_t place : places) {
        Sum& sum = sums[std::size_t(fine.parent(footprint.pixel[place], coarse))];
        sum.direction += footprint.exposure[place] * fine.centre(footprint.pixel[place]);
        sum.exposure += footprint.exposure[place];
    }
    std::vector<Cell> cells;
    for (const Sum& sum : sums)
        if (sum.exposure > 0.0) cells.push_back({sum.direction / sum.exposure, sum.exposure});
    return cells;
}

/// Sources expected in a ring for one row of the chain.
double expected_in(const BinTerm& term,
                   const Eigen::Ref<const Eigen::VectorXd>& row,
                   const std::vector<Cell>& cells,
                   double solid_angle) {
    double sum = 0.0;
    for (const Cell& cell : cells)
        sum += cell.exposure * expected_density(term, row, cell.direction);
    return sum * solid_angle;
}

/// @param mean  the mean row of the chain
Profile profile_of(const FigureContext& context,
                   const BinTerm& term,
                   const Eigen::VectorXd& mean,
                   const Direction& apex) {
    const Counts& counts = context.source.chain.counts;
    const BinCounts& bin = counts.surveys[term.survey].bins[term.bin];
    const Footprint& footprint = counts.surveys[term.survey].footprints[bin.footprint];
    const Pixelisation grid(counts.nside);
    const auto places = places_by_angle(footprint, grid, apex);
    double total = 0.0, before = 0.0;
    for (const double exposure : footprint.exposure) total += exposure;
    Profile profile{&term, bin.name, {}, {}};
    std::vector<std::vector<std::size_t>> members(n_rings);
    for (const std::size_t place : places) {
        const auto ring = std::min(std::size_t(before / total * n_rings), n_rings - 1);
        members[ring].push_back(place);
        before += footprint.exposure[place];
    }
    for (const auto& member : members) {
        if (member.empty()) continue;
        Ring ring;
        double exposure = 0.0;
        for (const std::size_t place : member) {
            const double w = footprint.exposure[place];
            exposure += w;
            ring.counted += bin.count[place];
            ring.angle_deg +=
                w * separation(grid.centre(footprint.pixel[place]), apex) / radians_per_degree;
        }
        ring.angle_deg /= exposure;
        ring.area_deg2 = exposure * full_sky_deg2 / double(grid.n_pixels());
        const Interval poisson = poisson_interval(ring.counted, level68);
        const double widening = std::sqrt(term.dispersion);
        ring.counted68 = {std::max(0.0, ring.counted - widening * (ring.counted - poisson[0])),
                          ring.counted + widening * (poisson[1] - ring.counted)};
        profile.cells.push_back(cells_of(counts, footprint, member));
        ring.expected = expected_in(term, mean, profile.cells.back(), grid.solid_angle());
        profile.rings.push_back(ring);
    }
    return profile;
}

/// Counts that draws of the posterior predict, with their Poisson noise (widened by the
/// dispersion), several times for each: one keyed stream a draw.
void predict(const FigureContext& context, Profile& profile, std::size_t index) {
    const Chain& chain = context.source.chain;
    const DrawRows rows = rows_of(chain.draws);
    const double solid_angle = Pixelisation(chain.counts.nside).solid_angle();
    const Eigen::Index n = std::min(n_rows_drawn, rows.rows());
    std::vector<std::vector<double>> predicted(profile.rings.size(),
                                               std::vector<double>(std::size_t(n) * n_repeats));
    parallel_for(std::size_t(n), context.options.threads, [&](std::size_t draw) {
        const Eigen::Index row = Eigen::Index(draw) * rows.rows() / n;
        Stream stream(context.source.seed,
                      Purpose::predictive,
                      index,
                      std::uint64_t(row),
                      std::uint64_t(rows.rows()));
        const Eigen::VectorXd parameters = rows.row(row).transpose();
        for (std::size_t ring = 0; ring < profile.rings.size(); ++ring) {
            const double mean =
                expected_in(*profile.term, parameters, profile.cells[ring], solid_angle);
            for (std::size_t repeat = 0; repeat < n_repeats; ++repeat) {
                boost::random::poisson_distribution<std::int64_t> poisson(mean);
                const auto noise = double(poisson(stream)) - mean;
                predicted[ring][draw * n_repeats + repeat] =
                    std::max(0.0, mean + std::sqrt(profile.term->dispersion) * noise);
            }
        }
    });
    for (std::size_t ring = 0; ring < profile.rings.size(); ++ring) {
        auto& values = predicted[ring];
        std::sort(values.begin(), values.end());
        const auto band = [&](double probability) {
            return Interval{quantile_of(values, 0.5 - 0.5 * probability),
                            quantile_of(values, 0.5 + 0.5 * probability)};
        };
        profile.rings[ring].band68 = band(level68);
        profile.rings[ring].band95 = band(level95);
    }
}

// ---- drawing ----

/// Sources per square degree.
double density_of(const Ring& ring, double counts) {
    return counts / ring.area_deg2;
}

Interval range_of(const Profile& profile) {
    Interval range{1e300, -1e300};
    for (const Ring& ring : profile.rings)
        for (const double counts :
             {ring.counted68[0], ring.counted68[1], ring.band95[0], ring.band95[1]}) {
            range[0] = std::min(range[0], density_of(ring, counts));
            range[1] = std::max(range[1], density_of(ring, counts));
        }
    const double margin = std::max(0.08 * (range[1] - range[0]), 1e-12);
    return {std::max(0.0, range[0] - margin), range[1] + margin};
}

void draw_bands(
    Clip& clip, const Profile& profile, const Scale& across, const Scale& up, Colour colour) {
    const auto band = [&](Interval Ring::*ends) {
        std::vector<Point> lower, upper;
        for (const Ring& ring : profile.rings) {
            const double x = across.at(ring.angle_deg);
            lower.push_back({x, up.at(density_of(ring, (ring.*ends)[0]))});
            upper.push_back({x, up.at(density_of(ring, (ring.*ends)[1]))});
        }
        return area_between(upper, lower);
    };
    clip.content.push_back(Shape{{band(&Ring::band95)}, colour.with_alpha(0.20)});
    clip.content.push_back(Shape{{band(&Ring::band68)}, colour.with_alpha(0.34)});
    Polyline expected;
    for (const Ring& ring : profile.rings)
        expected.point.push_back(
            {across.at(ring.angle_deg), up.at(density_of(ring, ring.expected))});
    clip.content.push_back(Shape{{expected}, std::nullopt, Stroke{0.9, colour, {3.0, 2.0}}});
}

void draw_panel(const FigureContext& context,
                Drawing& drawing,
                const Profile& profile,
                const Box& box,
                std::size_t series) {
    const Interval range = range_of(profile);
    const Scale across{0.0, 180.0, box.left, box.right};
    const Scale up{range[0], range[1], box.bottom, box.top};
    Clip clip{Drawing::edge_of(box), {}};
    draw_bands(clip, profile, across, up, palette::series(series));
    drawing.add(std::move(clip));
    for (const Ring& ring : profile.rings) {
        const double x = across.at(ring.angle_deg);
        drawing.line({x, up.at(density_of(ring, ring.counted68[0]))},
                     {x, up.at(density_of(ring, ring.counted68[1]))},
                     {0.8, palette::ink()});
        drawing.add(Disc{{x, up.at(density_of(ring, ring.counted))},
                         1.7,
                         palette::paper(),
                         Stroke{0.8, palette::ink()}});
    }
    draw_bottom_axis(drawing, context.fonts, across, box.bottom, {true, true, 60.0});
    draw_left_axis(drawing, context.fonts, up, box.left);
    Text name = text_at({box.right, box.top + 1.0},
                        shortened(context.fonts, profile.name, type::note, box.width()),
                        type::note,
                        Anchor::end);
    name.runs[0].face = Face::semibold;
    name.halo = 2.0;
    drawing.add(name);
}

/// All bins, side by side where the page is wide; returns the place below them.
double draw_panels(const FigureContext& context,
                   Drawing& drawing,
                   const std::vector<Profile>& profiles,
                   double top,
                   std::size_t series) {
    constexpr double height = 84.0, below = 16.0, left = 36.0, gap = 12.0;
    const std::size_t most = profiles.size() == 4 ? 2 : 3;  // no panel alone in its row
    const std::size_t n_columns =
        context.width() > 380.0 ? std::min<std::size_t>(profiles.size(), most) : 1;
    const double width = (context.width() - 10.0 - 14.0 - left * double(n_columns) -
                          gap * double(n_columns - 1)) /
                         double(n_columns);
    double bottom = top;
    for (std::size_t place = 0; place < profiles.size(); ++place) {
        const double x = 14.0 + left + double(place % n_columns) * (width + left + gap);
        const double y = top + 8.0 + double(place / n_columns) * (height + below + 8.0);
        draw_panel(context, drawing, profiles[place], {x, y, x + width, y + height}, series);
        bottom = std::max(bottom, y + height + below);
    }
    return bottom;
}

double chi_squared_of(const Profile& profile) {
    double sum = 0.0;
    for (const Ring& ring : profile.rings)
        sum += std::pow(ring.counted - ring.expected, 2) /
               (profile.term->dispersion * ring.expected);
    return sum;
}

std::string csv_of(const std::vector<Profile>& profiles) {
    CsvText csv({"bin",
                 "angle_deg",
                 "area_deg2",
                 "counted",
                 "low68",
                 "high68",
                 "expected",
                 "predicted_low95",
                 "predicted_low68",
                 "predicted_high68",
                 "predicted_high95"});
    for (const Profile& profile : profiles)
        for (const Ring& ring : profile.rings) {
            csv.text(profile.name).number(ring.angle_deg).number(ring.area_deg2);
            csv.number(ring.counted).number(ring.counted68[0]).number(ring.counted68[1]);
            csv.number(ring.expected).number(ring.band95[0]).number(ring.band68[0]);
            csv.number(ring.band68[1]).number(ring.band95[1]);
            csv.end_row();
        }
    return csv.str();
}

Sheet profile_sheet(const FigureContext& context,
                    std::size_t survey,
                    const Direction& apex,
                    const std::string& apex_words) {
    const std::string& name = context.source.chain.counts.surveys[survey].name;
    std::vector<Profile> profiles;
    const auto& terms = context.source.space.terms();
    const Eigen::VectorXd mean = mean_row(context.source.chain.draws);
    for (std::size_t index = 0; index < terms.size(); ++index) {
        if (terms[index].survey != survey) continue;
        profiles.push_back(profile_of(context, terms[index], mean, apex));
        predict(context, profiles.back(), index);
    }
    auto [sheet, top] = begin_sheet(
        context, "profile-" + name, "Counts of " + name + " against the angle from the apex");
    const bool shared = context.source.space.options().intrinsic_shared;
    double bottom = draw_panels(context, sheet.drawing, profiles, top, shared ? 1 : survey + 1);
    Text upwards = text_at({12.0, 0.5 * (top + bottom)},
                           "sources per square degree",
                           type::axis_title,
                           Anchor::middle);
    upwards.turn_deg = 90.0;
    sheet.drawing.add(upwards);
    sheet.drawing.add(text_at({0.5 * context.width(), bottom + type::axis_title + 1.0},
                              "angle from " + apex_words + " (deg)",
                              type::axis_title,
                              Anchor::middle));
    bottom = draw_notes(
        sheet.drawing,
        context.fonts,
        {fmt::format("Circles: counts with {0} bars. Dashed: expected. Bands: 68 and "
                     "95 % of what the posterior predicts, {0} noise included.",
                     is_dispersed(context, survey) ? "widened Poisson" : "Poisson")},
        14.0,
        bottom + 1.6 * type::axis_title,
        palette::grey_text());
    std::vector<std::string> words;
    for (const Profile& profile : profiles)
        words.push_back(fmt::format("{}: chi-squared {} in {} rings",
                                    profile.name,
                                    short_number(chi_squared_of(profile)),
                                    profile.rings.size()));
    sheet.alternative = fmt::format(
        "Mean counts of {} in rings about {}. {}.", name, apex_words, fmt::join(words, "; "));
    sheet.reading_aid =
        "Counts in rings of equal exposed area about the apex; about two circles in three "
        "should lie inside the darker band.";
    sheet.csv = csv_of(profiles);
    return end_sheet(context, std::move(sheet), bottom);
}

}  // namespace

std::vector<Sheet> profile_sheets(const FigureContext& context) {
    const auto series = vector_series(context.source);
    std::optional<Direction> apex = pointing_of(context, series.front());
    std::string words = "the mean direction of the velocity";
    if (!apex) {
        if (context.source.cmb_velocity.isZero(0.0)) return {};
        apex = context.source.cmb_velocity.normalized();
        words = "the direction of the CMB dipole";
    }
    std::vector<Sheet> sheets;
    for (std::size_t survey = 0; survey < context.source.chain.counts.surveys.size(); ++survey)
        sheets.push_back(profile_sheet(context, survey, *apex, words));
    return sheets;
}

}  // namespace deviascope
