// SPDX-License-Identifier: GPL-2.0-or-later
// catalogue -> COUNTS -> model
#pragma once

#include <filesystem>
#include <map>
#include <optional>
#include <string>
#include <vector>

#include "deviascope/sky/exclusion.h"
#include "deviascope/sky/frame.h"

namespace deviascope {

/// Half-open range [low, high) of a property, in the column's own unit; infinities allowed.
struct PropertyRange {
    std::string property;  ///< key of `columns`: flux, redshift, …
    double low = 0.0;
    double high = 0.0;
};

/// A bin of a survey, as the job file describes it.
struct BinInput {
    std::string name;
    std::vector<PropertyRange> select;              ///< empty where `counts` is given
    std::optional<std::filesystem::path> counts;    ///< a HEALPix count map instead
    std::optional<std::filesystem::path> exposure;  ///< multiplies the survey's
};

enum class BadRows { stop, skip };

/// What is needed to count a survey.
struct SurveyInput {
    std::string name;
    std::vector<std::filesystem::path> catalogue;
    std::optional<std::string> table;
    Frame frame = Frame::icrs;                   ///< of lon, lat
    std::map<std::string, std::string> columns;  ///< property -> column name; has lon, lat
    std::optional<std::filesystem::path> exposure;
    std::optional<Frame> map_frame;  ///< only where maps carry no COORDSYS
    std::vector<Exclusion> exclude;
    std::vector<PropertyRange> select;  ///< applies to every bin
    BadRows bad_rows = BadRows::stop;
    std::vector<BinInput> bins;
};

}  // namespace deviascope
