// SPDX-License-Identifier: GPL-2.0-or-later
#include "deviascope/ensemble/monitored.h"

#include <cmath>

namespace deviascope {

double MonitoredScalar::value(const double* parameters) const {
    const double* at = parameters + first;
    if (kind == Kind::parameter) return *at;
    const double amplitude = std::hypot(at[0], at[1], at[2]);
    if (kind == Kind::amplitude) return amplitude;
    return amplitude == 0.0 ? 0.0 : at[component] / amplitude;
}

std::vector<MonitoredScalar> monitored_scalars(const std::vector<Parameter>& parameters,
                                               const std::vector<VectorParameter>& vectors) {
    using Kind = MonitoredScalar::Kind;
    std::vector<MonitoredScalar> scalars;
    for (std::size_t index = 0; index < parameters.size(); ++index) {
        if (parameters[index].role != Role::sampled) continue;
        scalars.push_back(
            {parameters[index].name, Kind::parameter, static_cast<Eigen::Index>(index), 0});
    }
    for (const VectorParameter& vector : vectors) {
        if (vector.amplitude_free)
            scalars.push_back({vector.name + ".amplitude", Kind::amplitude, vector.first, 0});
        if (!vector.direction_free) continue;
        for (const int component : {0, 1, 2}) {
            const char axis = static_cast<char>('x' + component);
            scalars.push_back(
                {vector.name + ".direction." + axis, Kind::direction, vector.first, component});
        }
    }
    return scalars;
}

}  // namespace deviascope
