// SPDX-License-Identifier: GPL-2.0-or-later
#include "deviascope/summary/draw_values.h"

#include <algorithm>
#include <cmath>
#include <limits>

namespace deviascope {
namespace {

double bulk_of(const std::string& name, const std::vector<ScalarDiagnostics>& scalars) {
    const auto found = std::find_if(scalars.begin(), scalars.end(), [&](const auto& scalar) {
        return scalar.name == name;
    });
    return found == scalars.end() ? std::numeric_limits<double>::quiet_NaN() : found->bulk;
}

double or_one_a_walker(double effective, const Draws& draws) {
    return std::isfinite(effective) ? effective
                                    : static_cast<double>(draws.n_replicates * draws.n_walkers);
}

}  // namespace

DrawRows rows_of(const Draws& draws) {
    return {draws.value.data(),
            draws.n_rows * draws.n_replicates * draws.n_walkers,
            draws.n_parameters};
}

std::vector<double> column_of(const DrawRows& rows, Eigen::Index parameter) {
    std::vector<double> column(static_cast<std::size_t>(rows.rows()));
    Eigen::Map<Eigen::VectorXd>(column.data(), rows.rows()) = rows.col(parameter);
    return column;
}

Eigen::VectorXd mean_row(const Draws& draws) {
    return rows_of(draws).colwise().mean().transpose();
}

std::vector<double> amplitudes_of(const DrawRows& rows, Eigen::Index first) {
    std::vector<double> amplitude(static_cast<std::size_t>(rows.rows()));
    Eigen::Map<Eigen::VectorXd>(amplitude.data(), rows.rows()) =
        rows.middleCols<3>(first).rowwise().norm();
    return amplitude;
}

Directions directions_of(const DrawRows& rows, Eigen::Index first) {
    Directions directions;
    directions.unit.reserve(static_cast<std::size_t>(rows.rows()));
    for (Eigen::Index draw = 0; draw < rows.rows(); ++draw) {
        const Eigen::Vector3d vector = rows.block<1, 3>(draw, first).transpose();
        if (vector.isZero(0.0))
            ++directions.left_out;
        else
            directions.unit.push_back(vector.stableNormalized());
    }
    return directions;
}

double effective_values(const std::string& name,
                        const std::vector<ScalarDiagnostics>& scalars,
                        const Draws& draws) {
    return or_one_a_walker(bulk_of(name, scalars), draws);
}

double effective_directions(const VectorParameter& vector,
                            const std::vector<ScalarDiagnostics>& scalars,
                            const Draws& draws) {
    double fewest = std::numeric_limits<double>::quiet_NaN();
    for (const char* component : {".direction.x", ".direction.y", ".direction.z"})
        fewest = std::fmin(fewest, bulk_of(vector.name + component, scalars));
    return or_one_a_walker(fewest, draws);
}

}  // namespace deviascope
