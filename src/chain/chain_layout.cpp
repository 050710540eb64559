// SPDX-License-Identifier: GPL-2.0-or-later
#include "chain/chain_layout.h"

#include <fmt/format.h>

#include <Eigen/Core>
#include <boost/version.hpp>

namespace deviascope {

namespace chain_layout {

const h5::Identity& identity() {
    static const h5::Identity ours{
        "deviascope chain",
        1,
        "Draws from the posterior of the observer's velocity and the intrinsic dipole of "
        "source "
        "counts, made by deviascope. /draws is row x replicate x walker x parameter; "
        "/parameters says what each parameter is, /job where the chain comes from, /counts "
        "what "
        "was fitted, /outcome how the run ended (`unfinished` while it is running or if it was "
        "cut off). Every dataset has the attributes meaning, unit and dimensions (one word an "
        "axis)."};
    return ours;
}

std::array<std::string, n_kernels> kernel_names() {
    std::array<std::string, n_kernels> names;
    for (std::size_t kernel = 0; kernel < n_kernels; ++kernel)
        names[kernel] = name_of(static_cast<Kernel>(kernel));
    return names;
}

}  // namespace chain_layout

std::string library_versions() {
    return fmt::format("HDF5 {}, Boost {}.{}.{}, Eigen {}.{}.{}, compiler {}",
                       h5::library_version(),
                       BOOST_VERSION / 100000,
                       BOOST_VERSION / 100 % 1000,
                       BOOST_VERSION % 100,
                       EIGEN_WORLD_VERSION,
                       EIGEN_MAJOR_VERSION,
                       EIGEN_MINOR_VERSION,
                       __VERSION__);
}

}  // namespace deviascope
