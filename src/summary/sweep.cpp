// SPDX-License-Identifier: GPL-2.0-or-later
#include "deviascope/summary/sweep.h"

#include <Eigen/Cholesky>
#include <Eigen/Eigenvalues>
#include <cmath>

#include <fmt/format.h>

#include "deviascope/core/grouped_number.h"
#include "deviascope/core/physical_constants.h"
#include "summary/json_parts.h"
#include "summary/rounding.h"
#include "summary/text_table.h"

namespace deviascope {
namespace {

/// The job as it is, or `survey.dunlin.exclude.band = 20`.
std::string name_of_row(const SweepRow& row) {
    return row.path.empty() ? "the job as it is" : row.path + " = " + row.value;
}

void add_cell(std::string& line, double value) {
    line += ',';
    line += csv_number(value);
}

/// A field of CSV, quoted where it must be.
std::string field(const std::string& text) {
    if (text.find_first_of(",\"\n") == std::string::npos) return text;
    std::string quoted = "\"";
    for (const char c : text) quoted += c == '"' ? std::string("\"\"") : std::string(1, c);
    return quoted + "\"";
}

Json row_of(const SweepRow& row) {
    Json intrinsic = Json::object();
    for (const SweptDipole& dipole : row.intrinsic)
        intrinsic[dipole.name] = scalar(dipole.amplitude);
    return {{"path", row.path.empty() ? Json() : Json(row.path)},
            {"value", row.path.empty() ? Json() : Json(row.value)},
            {"sources", row.sources},
            {"sky_fraction", number(row.sky_fraction)},
            {"vector",
             {{"mean", vector_of(row.velocity.mean)},
              {"covariance", matrix_of(row.velocity.covariance)}}},
            {"speed_km_s", scalar(row.speed, speed_of_light_km_s)},
            {"galactic", lon_lat(row.galactic)},
            {"intrinsic", intrinsic},
            {"difference",
             {{"chi2", number(row.difference.chi2)},
              {"p", number(row.difference.probability)},
              {"sigma", number(row.difference.sigma)}}},
            {"converged", row.converged}};
}

std::string dipoles_of(const SweepRow& row) {
    std::string text;
    for (const SweptDipole& dipole : row.intrinsic) {
        const ScalarEstimate amplitude = in_unit(dipole.amplitude, 1e-3);
        text += fmt::format("{}{}",
                            text.empty() ? "" : ", ",
                            rounded(amplitude.median, half_width(amplitude.interval68)));
    }
    return text;
}

}  // namespace

GaussianDifference nested_difference(const VelocityGaussian& one,
                                     const VelocityGaussian& other) {
    Eigen::Matrix3d scatter = one.covariance - other.covariance;
    if (scatter.trace() < 0.0) scatter = -scatter;
    // Chains know a covariance to about a per cent: less than that is no scatter to measure in.
    constexpr double least_share = 0.03;
    const Eigen::Matrix3d larger =
        one.covariance.trace() > other.covariance.trace() ? one.covariance : other.covariance;
    const Eigen::LLT<Eigen::Matrix3d> factor(larger);
    if (factor.info() != Eigen::Success) return {};
    const Eigen::Matrix3d half = factor.matrixL().solve(scatter);
    const Eigen::SelfAdjointEigenSolver<Eigen::Matrix3d> share(
        Eigen::Matrix3d(factor.matrixL().solve(half.transpose())));
    if (!(share.eigenvalues().minCoeff() > least_share)) return {};
    return difference_of(one.mean - other.mean, scatter);
}

std::string to_json(const Sweep& sweep) {
    Json rows = Json::array();
    for (const SweepRow& row : sweep.rows) rows.push_back(row_of(row));
    return page_of({{"schema", 1},
                    {"job", sweep.job},
                    {"frame", name_of(sweep.frame)},
                    {"rows", rows},
                    {"warnings", Json(sweep.warnings)}});
}

std::string to_csv(const Sweep& sweep) {
    std::string text =
        "path,value,sources,sky_fraction,velocity_x,velocity_y,velocity_z,speed_km_s,"
        "speed_km_s_low68,speed_km_s_high68,l_deg,b_deg,difference_chi2,difference_sigma,"
        "converged";
    for (const SweptDipole& dipole : sweep.rows.front().intrinsic)
        text += fmt::format(",intrinsic_{}", dipole.name);
    text += "\n";
    for (const SweepRow& row : sweep.rows) {
        const ScalarEstimate speed = in_unit(row.speed, 1.0 / speed_of_light_km_s);
        text += fmt::format("{},{},{},{}",
                            field(row.path),
                            field(row.value),
                            row.sources,
                            csv_number(row.sky_fraction));
        for (const double value : row.velocity.mean) add_cell(text, value);
        for (const double value : {speed.median,
                                   speed.interval68[0],
                                   speed.interval68[1],
                                   row.galactic ? row.galactic->lon_deg : NAN,
                                   row.galactic ? row.galactic->lat_deg : NAN,
                                   row.difference.chi2,
                                   row.difference.sigma})
            add_cell(text, value);
        text += row.converged ? ",true" : ",false";
        for (const SweptDipole& dipole : row.intrinsic) add_cell(text, dipole.amplitude.median);
        text += "\n";
    }
    return text;
}

std::string to_text(const Sweep& sweep) {
    std::string text = heading(sweep.job + ": sweep", '=');
    text += '\n';
    text += warnings_block(sweep.warnings);
    text += '\n';
    TextTable table("lrrrrrr");
    table.row(
        {"", "sources", "speed (km/s)", "l (deg)", "b (deg)", "intrinsic (10^-3)", "sigma"});
    for (const SweepRow& row : sweep.rows) {
        const ScalarEstimate speed = in_unit(row.speed, 1.0 / speed_of_light_km_s);
        const double uncertainty = half_width(speed.interval68);
        table.row({name_of_row(row),
                   grouped(row.sources),
                   fmt::format("{} ({})",
                               rounded(speed.median, uncertainty),
                               rounded(speed.interval68, uncertainty)),
                   row.galactic ? fmt::format("{:.1f}", row.galactic->lon_deg) : "-",
                   row.galactic ? fmt::format("{:+.1f}", row.galactic->lat_deg) : "-",
                   dipoles_of(row),
                   std::isnan(row.difference.sigma)
                       ? "-"
                       : fmt::format("{:.1f}", row.difference.sigma)});
    }
    return text + table.text() +
           folded(
               "Sigma: difference of the velocity from the first row, in units of the scatter "
               "that is expected where one of the two fits uses a part of the other's data; "
               "`-` where they use the same data or parts of their own.",
               0);
}

}  // namespace deviascope
