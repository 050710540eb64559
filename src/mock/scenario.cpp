// SPDX-License-Identifier: GPL-2.0-or-later
#include "deviascope/mock/scenario.h"

#include <algorithm>

#include "deviascope/core/error.h"

namespace deviascope {

namespace {

std::string default_lon_column(Frame frame) {
    switch (frame) {
        case Frame::galactic:
            return "GLON";
        case Frame::ecliptic:
            return "ELON";
        case Frame::icrs:
            break;
    }
    return "RA";
}

std::string default_lat_column(Frame frame) {
    switch (frame) {
        case Frame::galactic:
            return "GLAT";
        case Frame::ecliptic:
            return "ELAT";
        case Frame::icrs:
            break;
    }
    return "DEC";
}

std::string upper_case(std::string text) {
    for (char& c : text)
        if (c >= 'a' && c <= 'z') c = static_cast<char>(c - 'a' + 'A');
    return text;
}

}  // namespace

const std::vector<std::string>& property_names() {
    static const std::vector<std::string> names = {
        "alpha", "flux", "redshift", "magnitude", "size"};
    return names;
}

std::string name_of(Property property) {
    return property_names()[static_cast<std::size_t>(property)];
}

std::optional<Property> property_of_name(std::string_view name) {
    const auto& names = property_names();
    const auto found = std::find(names.begin(), names.end(), name);
    if (found == names.end()) return {};
    return static_cast<Property>(found - names.begin());
}

bool MockSurvey::has(Property property) const {
    switch (property) {
        case Property::alpha:
            return true;
        case Property::flux:
            return flux.has_value();
        case Property::redshift:
            return redshift.has_value();
        case Property::magnitude:
            return magnitude.has_value();
        case Property::size:
            return size.has_value();
    }
    return false;
}

KeptRange MockSurvey::kept_range(Property property) const {
    for (const KeptRange& range : keep)
        if (range.property == property) return range;
    KeptRange unbounded;
    unbounded.property = property;
    return unbounded;
}

double MockSurvey::scatter_of(Property property) const {
    switch (property) {
        case Property::alpha:
            return 0.0;
        case Property::flux:
            return scatter.flux;
        case Property::redshift:
            return scatter.redshift;
        case Property::magnitude:
            return scatter.magnitude;
        case Property::size:
            return scatter.size;
    }
    return 0.0;
}

std::string MockSurvey::catalogue_file() const {
    return output.file.empty() ? name + ".fits" : output.file;
}

std::string MockSurvey::exposure_file() const {
    const auto* gradient = exposure ? std::get_if<ExposureGradient>(&*exposure) : nullptr;
    if (gradient == nullptr) return {};
    return gradient->file.empty() ? name + "-exposure.fits" : gradient->file;
}

std::string MockSurvey::lon_column() const {
    return output.lon_column.empty() ? default_lon_column(output.frame) : output.lon_column;
}

std::string MockSurvey::lat_column() const {
    return output.lat_column.empty() ? default_lat_column(output.frame) : output.lat_column;
}

std::vector<PropertyColumn> MockSurvey::property_columns() const {
    if (output.columns) return *output.columns;
    std::vector<PropertyColumn> columns;
    for (std::size_t number = 0; number < n_properties; ++number) {
        const auto property = static_cast<Property>(number);
        if (has(property)) columns.push_back({property, upper_case(name_of(property))});
    }
    return columns;
}

}  // namespace deviascope
