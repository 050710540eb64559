// SPDX-License-Identifier: GPL-2.0-or-later
// CORE (private to this folder): what a Reader holds
#pragma once

#include <cstdint>
#include <map>
#include <string>

#include "core/h5/reader.h"
#include "core/h5/session.h"

namespace deviascope::h5 {

struct Reader::Parts {
    H5::H5File file;
    std::uint64_t n_bytes = 0;  ///< of the whole file
    /// Columns that are being read, with their lengths.
    struct Column {
        H5::DataSet set;
        std::size_t length = 0;
    };
    std::map<std::string, Column> columns;
};

}  // namespace deviascope::h5
