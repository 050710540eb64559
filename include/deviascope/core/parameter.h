// SPDX-License-Identifier: GPL-2.0-or-later
// CORE: what model, ensemble, chain and summary agree on about a row of the chain
#pragma once

#include <Eigen/Core>
#include <string>
#include <vector>

namespace deviascope {

/// How a stored parameter comes about.
enum class Role {
    sampled,   ///< a function of the sampler's coordinates
    constant,  ///< fixed by its prior; stored, left out of diagnostics
    redrawn    ///< integrated out, drawn from its exact conditional when a row is stored
};

/// One column of the stored draws.
struct Parameter {
    std::string
        name;  ///< for instance `velocity.x`, `intrinsic.dunlin.y`, `weight.dunlin.faint`
    std::string unit;     ///< for instance `c`, `1`, `1/sr`
    std::string meaning;  ///< one plain sentence
    Role role = Role::sampled;
};

/// Three neighbouring parameters that form a vector.
struct VectorParameter {
    std::string name;            ///< `velocity`, `intrinsic.dunlin`, `intrinsic.all`
    Eigen::Index first = 0;      ///< index of its x component; y and z follow
    bool amplitude_free = true;  ///< false where the prior fixes the amplitude
    bool direction_free = true;  ///< false where the prior fixes the direction (axis, fixed)
};

}  // namespace deviascope
