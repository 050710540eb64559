// SPDX-License-Identifier: GPL-2.0-or-later
// SUMMARY, private: what the JSON files have in common
#pragma once

#include <nlohmann/json.hpp>
#include <optional>
#include <string>

#include "deviascope/sky/direction.h"
#include "deviascope/summary/interval.h"

namespace deviascope {

using Json = nlohmann::ordered_json;

/// Null where it is not finite.
Json number(double value);
/// Null where an end is not finite.
Json interval(const Interval& ends, double unit = 1.0);
template <class Value>
Json or_null(const std::optional<Value>& value) {
    return value ? number(*value) : Json();
}
/// A constant is nothing estimated: all null.
ScalarEstimate unless_constant(const ScalarEstimate& estimate);
/// `median`, `mean`, `sd`, `interval68`, `interval95`.
Json scalar(const ScalarEstimate& given, double unit = 1.0);
/// `median` and `interval68` alone.
Json median_and_interval(const ScalarEstimate& given, double unit = 1.0);
/// `lon_deg` and `lat_deg`.
Json lon_lat(const std::optional<LonLat>& place);
/// Three numbers.
Json vector_of(const Eigen::Vector3d& vector);
/// Three rows of three numbers.
Json matrix_of(const Eigen::Matrix3d& matrix);
/// The text of a file: indented, ends with a new line; bytes that are no UTF-8 are replaced.
std::string page_of(const Json& json);

}  // namespace deviascope
