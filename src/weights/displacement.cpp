// SPDX-License-Identifier: GPL-2.0-or-later
#include "weights/displacement.h"

#include <cmath>
#include <limits>
#include <numbers>

namespace deviascope {

namespace {
constexpr double magnitudes_per_e_fold = 2.5 / std::numbers::ln10;
}  // namespace

Displaced displaced_by_boost(const std::string& property) {
    if (property == "flux") return Displaced::flux;
    if (property == "magnitude") return Displaced::magnitude;
    if (property == "redshift") return Displaced::redshift;
    if (property == "size") return Displaced::size;
    return Displaced::not_at_all;
}

double coordinate_of(Displaced kind, double value) {
    constexpr double undefined = std::numeric_limits<double>::quiet_NaN();
    if (kind == Displaced::redshift) return value > -1.0 ? std::log1p(value) : undefined;
    if (kind == Displaced::flux || kind == Displaced::size)
        return value > 0.0 ? std::log(value) : undefined;
    return value;
}

double value_at(Displaced kind, double y) {
    if (kind == Displaced::redshift) return std::expm1(y);
    return kind == Displaced::flux || kind == Displaced::size ? std::exp(y) : y;
}

double speed_of(Displaced kind) {
    switch (kind) {
        case Displaced::flux:
            return 1.0;
        case Displaced::magnitude:
            return -magnitudes_per_e_fold;
        case Displaced::redshift:
        case Displaced::size:
            return -1.0;
        case Displaced::not_at_all:
            break;
    }
    return 0.0;
}

bool feels_spectral_index(Displaced kind) {
    return kind == Displaced::flux || kind == Displaced::magnitude;
}

double neighbourhood_of(Displaced kind) {
    constexpr double e_folds = 1.4;
    if (kind == Displaced::redshift) return 0.4;
    return kind == Displaced::magnitude ? e_folds * magnitudes_per_e_fold : e_folds;
}

bool is_end_of_property(Displaced kind, double value) {
    const bool has_end =
        kind == Displaced::flux || kind == Displaced::size || kind == Displaced::redshift;
    return has_end && value == 0.0;
}

const char* unit_of_coordinate(Displaced kind) {
    switch (kind) {
        case Displaced::flux:
            return "ln S";
        case Displaced::magnitude:
            return "magnitudes";
        case Displaced::redshift:
            return "ln(1+z)";
        case Displaced::size:
            return "ln s";
        case Displaced::not_at_all:
            break;
    }
    return "";
}

}  // namespace deviascope
