// SPDX-License-Identifier: GPL-2.0-or-later
#include "summary/json_parts.h"

#include <cmath>

namespace deviascope {

Json number(double value) {
    return std::isfinite(value) ? Json(value) : Json();
}

Json interval(const Interval& ends, double unit) {
    if (!std::isfinite(ends[0]) || !std::isfinite(ends[1])) return {};
    return Json::array({ends[0] * unit, ends[1] * unit});
}

ScalarEstimate unless_constant(const ScalarEstimate& estimate) {
    return estimate.is_constant() ? ScalarEstimate{} : estimate;
}

Json scalar(const ScalarEstimate& given, double unit) {
    const ScalarEstimate estimate = unless_constant(given);
    return {{"median", number(estimate.median * unit)},
            {"mean", number(estimate.mean * unit)},
            {"sd", number(estimate.sd * unit)},
            {"interval68", interval(estimate.interval68, unit)},
            {"interval95", interval(estimate.interval95, unit)}};
}

Json lon_lat(const std::optional<LonLat>& place) {
    if (!place) return {{"lon_deg", Json()}, {"lat_deg", Json()}};
    return {{"lon_deg", number(place->lon_deg)}, {"lat_deg", number(place->lat_deg)}};
}

Json median_and_interval(const ScalarEstimate& given, double unit) {
    const ScalarEstimate estimate = unless_constant(given);
    return {{"median", number(estimate.median * unit)},
            {"interval68", interval(estimate.interval68, unit)}};
}

Json vector_of(const Eigen::Vector3d& vector) {
    return Json::array({number(vector[0]), number(vector[1]), number(vector[2])});
}

Json matrix_of(const Eigen::Matrix3d& matrix) {
    Json rows = Json::array();
    for (Eigen::Index row = 0; row < 3; ++row) rows.push_back(vector_of(matrix.row(row)));
    return rows;
}

std::string page_of(const Json& json) {
    constexpr int indent = 2;
    return json.dump(indent, ' ', false, Json::error_handler_t::replace) + "\n";
}

}  // namespace deviascope
