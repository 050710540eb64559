// SPDX-License-Identifier: GPL-2.0-or-later
// CORE (private): how files of ours say what they are
#pragma once

#include <cstdint>
#include <string>

#include "core/h5/reader.h"
#include "core/h5/writer.h"

namespace deviascope::h5 {

/// Attributes of the root group: `format`, `schema`, `meaning`.
struct Identity {
    std::string format;  ///< for instance `deviascope chain`
    std::int64_t schema = 1;
    std::string meaning;  ///< what is this, and how is it laid out, in plain sentences
};

void write_identity(Writer& writer, const Identity& identity);

/// Errors: InputError where the file is of another format, or of a schema above
/// `identity.schema`.
void check_identity(const Reader& reader, const Identity& identity);

}  // namespace deviascope::h5
