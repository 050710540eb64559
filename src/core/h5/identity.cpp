// SPDX-License-Identifier: GPL-2.0-or-later
#include "core/h5/identity.h"

#include <fmt/format.h>

namespace deviascope::h5 {

void write_identity(Writer& writer, const Identity& identity) {
    writer.attribute("/", "format", identity.format);
    writer.attribute("/", "schema", identity.schema);
    writer.attribute("/", "meaning", identity.meaning);
}

void check_identity(const Reader& reader, const Identity& identity) {
    const auto format = reader.text("/", "format");
    if (format != identity.format)
        throw reader.error("",
                           format ? "a file of the format \"" + *format + "\""
                                  : "an HDF5 file without a format attribute",
                           "a " + identity.format + " is needed",
                           "check the path");
    const std::int64_t schema = reader.required_integer("/", "schema");
    if (schema < 1 || schema > identity.schema)
        throw reader.error("/@schema",
                           fmt::format("schema {}", schema),
                           fmt::format("this version reads 1 … {}", identity.schema),
                           "use a newer version of the program");
}

}  // namespace deviascope::h5
