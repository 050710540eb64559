// SPDX-License-Identifier: GPL-2.0-or-later
#include "deviascope/summary/result_tables.h"

#include <fmt/format.h>

#include <algorithm>
#include <cmath>

#include "deviascope/core/grouped_number.h"
#include "deviascope/core/physical_constants.h"
#include "summary/rounding.h"
#include "summary/vector_words.h"

namespace deviascope {
namespace {

constexpr double per_thousand = 1000.0;

Cell measured(const ScalarEstimate& estimate, double unit) {
    const double error = half_width(estimate.interval68) * unit;
    return {rounded(estimate.median * unit, error),
            rounded((estimate.interval68[1] - estimate.median) * unit, error),
            rounded((estimate.median - estimate.interval68[0]) * unit, error)};
}

Cell interval_cell(const Interval& interval, double unit, double error) {
    return rounded(Interval{interval[0] * unit, interval[1] * unit}, error * unit);
}

/// The median with its 68 % interval, or the limit where it is not told from zero; then what
/// holds 95 %.
std::vector<Cell> amplitude_cells(const VectorSummary& vector, double unit) {
    if (vector.amplitude_limits) {
        const std::string limit = rounded(*vector.amplitude_limits, 1.0 / unit);
        return {"< " + limit + " (95 %)", "0 to " + limit};
    }
    return {measured(vector.amplitude, unit),
            interval_cell(
                vector.amplitude.interval95, unit, half_width(vector.amplitude.interval68))};
}

/// Longitude and latitude in degrees, rounded by the region's standard deviation.
void add_place(std::vector<Cell>& row, const VectorSummary& vector) {
    if (!vector.galactic) {
        for (int cell = 0; cell < 4; ++cell) row.emplace_back("–");
    } else {
        // 68.27 % of a circular Gaussian lie within 1.515 standard deviations.
        const double sd = vector.region68 && vector.region68->radius_deg
                              ? *vector.region68->radius_deg / 1.515
                              : 0.0;
        row.emplace_back(
            rounded_longitude(vector.galactic->lon_deg, vector.galactic->lat_deg, sd));
        row.emplace_back(rounded(vector.galactic->lat_deg, sd));
        row.emplace_back(rounded_longitude(vector.icrs->lon_deg, vector.icrs->lat_deg, sd));
        row.emplace_back(rounded(vector.icrs->lat_deg, sd));
    }
    row.emplace_back(vector.region68 && vector.region68->radius_deg
                         ? short_number(*vector.region68->radius_deg)
                         : "–");
    row.emplace_back(vector.region68 ? short_number(vector.region68->area_deg2) : "–");
}

std::vector<Cell> vector_row(const VectorSummary& vector,
                             const std::string& quantity,
                             double unit) {
    std::vector<Cell> row{name_of(vector), quantity};
    if (!vector.amplitude_free) {
        row.emplace_back(short_number(vector.amplitude.median * unit) + " (fixed)");
        row.emplace_back("–");
        row.emplace_back("–");
    } else {
        for (Cell& cell : amplitude_cells(vector, unit)) row.push_back(std::move(cell));
        row.emplace_back(short_number(vector.prior_median_amplitude * unit));
    }
    add_place(row, vector);
    return row;
}

std::string number(double value) {
    return std::isfinite(value) ? fmt::format("{:.10g}", value) : "";
}

template <class Value>
std::string number(const std::optional<Value>& value) {
    return value ? number(*value) : "";
}

std::string csv_row(const VectorSummary& vector) {
    const auto lon = [](const std::optional<LonLat>& place) {
        return place ? number(place->lon_deg) : "";
    };
    const auto lat = [](const std::optional<LonLat>& place) {
        return place ? number(place->lat_deg) : "";
    };
    const ScalarEstimate& a = vector.amplitude;
    std::string row = vector.name;
    for (const double value : {a.median,
                               a.mean,
                               a.sd,
                               a.interval68[0],
                               a.interval68[1],
                               a.interval95[0],
                               a.interval95[1],
                               vector.prior_median_amplitude})
        row += fmt::format(",{}", number(value));
    for (const std::string& cell :
         {lon(vector.galactic), lat(vector.galactic), lon(vector.icrs), lat(vector.icrs)})
        row += fmt::format(",{}", cell);
    for (const auto& region : {vector.region68, vector.region95})
        row += region ? fmt::format(
                            ",{},{}", number(region->radius_deg), number(region->area_deg2))
                      : ",,";
    return row + "\n";
}

bool has_limits(const Summary& summary) {
    return summary.velocity.amplitude_limits ||
           std::ranges::any_of(summary.intrinsic, [](const VectorSummary& vector) {
               return vector.amplitude_limits.has_value();
           });
}

}  // namespace

ResultTable results_table(const Summary& summary) {
    ResultTable table;
    table.name = "results";
    table.caption =
        "Velocity of the observer and intrinsic dipoles: medians with 68 % intervals of the "
        "posterior, 95 % intervals, the median under the prior alone, mean directions (deg), "
        "and radius (deg) and area (square degrees) of the 68 % region of direction.";
    if (has_limits(summary))
        table.caption +=
            " Amplitudes that are not told from zero have the upper limit below which 95.45 % "
            "of the draws lie.";
    if (!summary.sampling.converged)
        table.caption += " The sampling has NOT converged: not for publication.";
    table.sides = "llrrrrrrrrr";
    table.header = {
        "vector", "in", "median", "95 %", "prior", "l", "b", "RA", "Dec", "r68", "A68"};
    table.rows.push_back(vector_row(summary.velocity, "km/s", speed_of_light_km_s));
    table.rows.push_back(vector_row(summary.velocity, "10⁻³ c", per_thousand));
    // The same direction once more would only fill the row.
    std::fill(table.rows.back().begin() + 5, table.rows.back().end(), Cell(""));
    for (const VectorSummary& vector : summary.intrinsic)
        table.rows.push_back(vector_row(vector, "10⁻³", per_thousand));
    table.csv =
        "vector,amplitude_median,amplitude_mean,amplitude_sd,amplitude_low68,amplitude_high68,"
        "amplitude_low95,amplitude_high95,amplitude_prior_median,l_deg,b_deg,ra_deg,dec_deg,"
        "radius68_deg,area68_deg2,radius95_deg,area95_deg2\n" +
        csv_row(summary.velocity);
    for (const VectorSummary& vector : summary.intrinsic) table.csv += csv_row(vector);
    return table;
}

ResultTable bins_table(const Summary& summary) {
    ResultTable table;
    table.name = "bins";
    table.caption =
        "Bins: sources and pixels kept, fraction of the sky, sources per steradian at full "
        "exposure, and kinematic weight under the prior and in the posterior (68 % intervals).";
    table.sides = "llrrrrrr";
    table.header = {"survey",
                    "bin",
                    "sources",
                    "pixels",
                    "of the sky",
                    "sources per sr",
                    "weight, prior",
                    "posterior"};
    table.csv =
        "survey,bin,sources,pixels,sky_fraction,monopole_median_per_sr,monopole_low68_per_sr,"
        "monopole_high68_per_sr,weight_prior_mean,weight_prior_sd,weight_median,weight_low68,"
        "weight_high68\n";
    for (const BinSummary& bin : summary.bins) {
        const bool is_fixed = bin.weight.is_constant();
        const double sd = bin.weight_prior_sd;
        table.rows.push_back(
            {bin.survey,
             bin.bin,
             grouped(bin.sources),
             grouped(bin.pixels),
             fmt::format("{:.4f}", bin.sky_fraction),
             measured(bin.monopole, 1.0),
             is_fixed
                 ? Cell("fixed")
                 : Cell(rounded(bin.weight_prior_mean, sd), rounded(sd, sd), rounded(sd, sd)),
             is_fixed ? Cell(rounded(bin.weight.median, 0.0)) : measured(bin.weight, 1.0)});
        table.csv += fmt::format("{},{},{},{}", bin.survey, bin.bin, bin.sources, bin.pixels);
        for (const double value : {bin.sky_fraction,
                                   bin.monopole.median,
                                   bin.monopole.interval68[0],
                                   bin.monopole.interval68[1],
                                   bin.weight_prior_mean,
                                   bin.weight_prior_sd,
                                   bin.weight.median,
                                   bin.weight.interval68[0],
                                   bin.weight.interval68[1]})
            table.csv += fmt::format(",{}", number(value));
        table.csv += "\n";
    }
    return table;
}

}  // namespace deviascope
