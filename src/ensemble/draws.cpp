// SPDX-License-Identifier: GPL-2.0-or-later
#include "deviascope/ensemble/draws.h"

namespace deviascope {

KernelTally& KernelTally::operator+=(const KernelTally& other) {
    for (std::size_t kernel = 0; kernel < n_kernels; ++kernel) {
        tried[kernel] += other.tried[kernel];
        taken[kernel] += other.taken[kernel];
    }
    return *this;
}

}  // namespace deviascope
