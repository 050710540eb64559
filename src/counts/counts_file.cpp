// SPDX-License-Identifier: GPL-2.0-or-later
#include "deviascope/counts/counts_file.h"

#include "core/h5/identity.h"
#include "core/h5/replaced_file.h"
#include "counts/counts_group.h"

namespace deviascope {

namespace {

const h5::Identity& identity() {
    static const h5::Identity ours{
        "deviascope counts",
        1,
        "Counts of distant sources in pixels of the sky, made by deviascope from catalogues; "
        "the group /counts holds them, the attribute `digest` says what they were made from. "
        "Every dataset has the attributes meaning, unit and dimensions (one word an axis)."};
    return ours;
}

}  // namespace

void write_counts(const std::filesystem::path& path, const CountsFile& file) {
    h5::write_file(path, [&](h5::Writer& writer) {
        h5::write_identity(writer, identity());
        writer.attribute("/", "version", file.version);
        writer.attribute("/", "digest", file.digest);
        write_counts_group(writer, "/counts", file.counts);
    });
}

CountsFile read_counts(const std::filesystem::path& path) {
    const h5::Reader reader(path);
    h5::check_identity(reader, identity());
    CountsFile file;
    file.version = reader.required_text("/", "version");
    file.digest = reader.required_text("/", "digest");
    file.counts = read_counts_group(reader, "/counts");
    return file;
}

}  // namespace deviascope
