// SPDX-License-Identifier: GPL-2.0-or-later
#include "deviascope/chain/export_draws.h"

#include <fmt/format.h>

#include <array>
#include <cmath>
#include <limits>
#include <memory>

#include "core/fits/fits_file.h"
#include "core/gzip/text_sink.h"
#include "deviascope/core/error.h"
#include "deviascope/core/physical_constants.h"
#include "deviascope/sky/frame.h"

namespace deviascope {
namespace {

namespace fs = std::filesystem;

constexpr std::size_t n_integers = 3;  // step, replicate, walker

/// Amplitude, then longitude and latitude in both frames, then the speed where it is one.
void append_vector(const std::array<Eigen::Matrix3d, 2>& to_galactic_and_icrs,
                   const VectorParameter& vector,
                   const double* row,
                   std::vector<double>& cells) {
    constexpr double undefined = std::numeric_limits<double>::quiet_NaN();
    const Eigen::Vector3d value(
        row[vector.first], row[vector.first + 1], row[vector.first + 2]);
    cells.push_back(value.norm());
    for (const Eigen::Matrix3d& turn : to_galactic_and_icrs) {
        const LonLat place =
            value.isZero(0.0) ? LonLat{undefined, undefined} : lon_lat_of(turn * value);
        cells.push_back(place.lon_deg);
        cells.push_back(place.lat_deg);
    }
    if (vector.name == "velocity") cells.push_back(value.norm() * speed_of_light_km_s);
}

/// One exported row.
struct ExportRow {
    std::array<std::int64_t, n_integers> integer{};
    std::vector<double> real;
};

template <class Take>
std::int64_t for_each_row(const Chain& chain, int thin, const Take& take) {
    const Draws& draws = chain.draws;
    const std::array turns{rotation(chain.counts.frame, Frame::galactic),
                           rotation(chain.counts.frame, Frame::icrs)};
    std::int64_t n = 0;
    ExportRow row;
    for (Eigen::Index stored = 0; stored < draws.n_rows; stored += thin)
        for (Eigen::Index replicate = 0; replicate < draws.n_replicates; ++replicate)
            for (Eigen::Index walker = 0; walker < draws.n_walkers; ++walker) {
                const auto place = static_cast<std::size_t>(
                    (stored * draws.n_replicates + replicate) * draws.n_walkers + walker);
                const double* values = draws.row_of(stored, replicate, walker);
                row.integer = {
                    chain.warm_up.discarded + chain.warm_up.store_every * (stored + 1),
                    replicate + 1,
                    walker + 1};
                row.real = {draws.log_posterior[place], draws.log_likelihood[place]};
                row.real.insert(row.real.end(), values, values + draws.n_parameters);
                for (const VectorParameter& vector : chain.vectors)
                    append_vector(turns, vector, values, row.real);
                take(row);
                ++n;
            }
    return n;
}

std::int64_t export_csv(const Chain& chain, const fs::path& path, int thin, bool gzip) {
    TextSink sink(path, gzip);
    std::string line;
    for (const ExportColumn& column : export_columns(chain))
        line += (line.empty() ? "" : ",") + column.name;
    sink.write(line + "\n");
    const std::int64_t n = for_each_row(chain, thin, [&](const ExportRow& row) {
        line = fmt::format("{},{},{}", row.integer[0], row.integer[1], row.integer[2]);
        for (const double value : row.real)
            line += std::isnan(value) ? "," : fmt::format(",{:.17g}", value);
        sink.write(line + "\n");
    });
    sink.close();
    return n;
}

void write_cards(fits::TableWriter& writer, const Chain& chain, int thin) {
    writer.card("CREATOR", "deviascope " + chain.provenance.version, "program");
    writer.card("JOB", chain.provenance.job_name, "job file");
    writer.card("SEED", static_cast<std::int64_t>(chain.provenance.seed), "of the job");
    writer.card("VECFRAME", name_of(chain.counts.frame), "frame of x, y, z");
    writer.card("VELUNIT", std::string("c"), "of velocities but speed_km_s: speed of light");
    writer.card("THIN", std::int64_t{thin}, "every how many stored rows");
}

std::int64_t export_fits(const Chain& chain, const fs::path& path, int thin) {
    constexpr std::size_t rows_at_a_time = 8192;
    std::vector<fits::TableWriter::NewColumn> columns;
    for (const ExportColumn& column : export_columns(chain))
        columns.push_back(
            {column.name, columns.size() < n_integers ? "1K" : "1D", column.unit});
    fits::TableWriter writer(path, "DRAWS", columns);
    write_cards(writer, chain, thin);
    std::vector<std::vector<std::int64_t>> integers(n_integers);
    std::vector<std::vector<double>> reals(columns.size() - n_integers);
    std::int64_t written = 0;
    const auto flush = [&] {
        const auto n = static_cast<std::int64_t>(integers[0].size());
        for (std::size_t column = 0; column < n_integers; ++column)
            writer.write(column, written, std::span<const std::int64_t>(integers[column]));
        for (std::size_t column = 0; column < reals.size(); ++column)
            writer.write(column + n_integers, written, std::span<const double>(reals[column]));
        for (auto& column : integers) column.clear();
        for (auto& column : reals) column.clear();
        written += n;
    };
    for_each_row(chain, thin, [&](const ExportRow& row) {
        for (std::size_t column = 0; column < n_integers; ++column)
            integers[column].push_back(row.integer[column]);
        for (std::size_t column = 0; column < reals.size(); ++column)
            reals[column].push_back(row.real[column]);
        if (integers[0].size() == rows_at_a_time) flush();
    });
    if (!integers[0].empty()) flush();
    writer.close();
    return written;
}

/// A unit as FITS writes it (FITS Standard 4.0, section 4.3); the speed of light is none.
std::string fits_unit(const std::string& unit) {
    if (unit == "1" || unit == "c") return "";
    return unit == "1/sr" ? "sr-1" : unit;
}

}  // namespace

std::vector<ExportColumn> export_columns(const Chain& chain) {
    std::vector<ExportColumn> columns{{"step", ""},
                                      {"replicate", ""},
                                      {"walker", ""},
                                      {"log_posterior", ""},
                                      {"log_likelihood", ""}};
    for (const Parameter& parameter : chain.parameters)
        columns.push_back({parameter.name, fits_unit(parameter.unit)});
    for (const VectorParameter& vector : chain.vectors) {
        const bool is_velocity = vector.name == "velocity";
        columns.push_back({vector.name + ".amplitude", ""});
        for (const char* angle : {".l_deg", ".b_deg", ".ra_deg", ".dec_deg"})
            columns.push_back({vector.name + angle, "deg"});
        if (is_velocity) columns.push_back({"velocity.speed_km_s", "km/s"});
    }
    return columns;
}

std::int64_t export_draws(const Chain& chain, const fs::path& path, int thin) {
    ensure(thin >= 1, "draws are thinned by at least 1");
    const std::string name = path.filename().string();
    if (name.ends_with(".fits")) return export_fits(chain, path, thin);
    if (name.ends_with(".csv")) return export_csv(chain, path, thin, false);
    if (name.ends_with(".csv.gz")) return export_csv(chain, path, thin, true);
    throw UsageError({path.string(),
                      "the ending tells no format",
                      ".fits, .csv or .csv.gz",
                      "name the file accordingly"});
}

}  // namespace deviascope
