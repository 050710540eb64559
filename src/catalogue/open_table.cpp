// SPDX-License-Identifier: GPL-2.0-or-later
#include <fmt/format.h>

#include <algorithm>
#include <set>

#include "catalogue/csv_reader.h"
#include "catalogue/fits_reader.h"
#include "catalogue/hdf5_reader.h"
#include "core/gzip/byte_source.h"
#include "deviascope/catalogue/table.h"
#include "deviascope/core/error.h"

namespace deviascope {

namespace {

enum class Content { fits, csv, gzip, hdf5, binary };

/// The beginning of a file, uncompressed. Errors: InputError.
struct Beginning {
    bool compressed = false;
    std::string bytes;
};

Beginning beginning_of(const std::filesystem::path& path) {
    ByteSource source(path);
    Beginning beginning{false, std::string(4096, '\0')};
    beginning.bytes.resize(source.read(beginning.bytes));
    beginning.compressed = source.is_compressed();
    return beginning;
}

/// Signatures: FITS Standard 4.0 section 4.4.1; RFC 1952 section 2.3.1; HDF5 File Format
/// Specification 3.0 section II.A (at byte 0, 512, 1024, 2048 …).
Content content_of(std::string_view bytes) {
    using namespace std::string_view_literals;
    if (bytes.starts_with("SIMPLE  ="sv)) return Content::fits;
    if (bytes.starts_with("\x1f\x8b"sv)) return Content::gzip;
    for (const std::size_t offset : {0U, 512U, 1024U, 2048U})
        if (bytes.substr(std::min(offset, bytes.size())).starts_with("\x89HDF\r\n\x1a\n"sv))
            return Content::hdf5;
    return bytes.find('\0') != std::string_view::npos ? Content::binary : Content::csv;
}

InputError wrongly_compressed(const std::filesystem::path& path, const char* what) {
    return InputError({path.string(),
                       fmt::format("inside the gzip compression is {}", what),
                       "FITS and CSV files may be compressed, once",
                       "uncompress the file first"});
}

InputError no_tables_in_csv(const std::filesystem::path& path, const std::string& table) {
    return InputError({path.string(),
                       fmt::format("table `{}` was asked for in a CSV file", table),
                       "a table is named in FITS and HDF5 files only",
                       "remove `table`"});
}

}  // namespace

std::unique_ptr<TableReader> open_table(const std::filesystem::path& path,
                                        const std::optional<std::string>& table,
                                        const std::vector<std::string>& columns) {
    ensure(std::set(columns.begin(), columns.end()).size() == columns.size(),
           "a column is asked for once only");
    const Beginning beginning = beginning_of(path);
    switch (content_of(beginning.bytes)) {
        case Content::fits:
            return std::make_unique<FitsReader>(path, table, columns);
        case Content::gzip:
            throw wrongly_compressed(path, "another gzip file");
        case Content::hdf5:
            if (beginning.compressed) throw wrongly_compressed(path, "an HDF5 file");
            return std::make_unique<Hdf5Reader>(path, table, columns);
        case Content::binary:
            throw InputError(
                {path.string(),
                 "the content is neither a FITS or HDF5 file nor plain text",
                 "a FITS binary table, an HDF5 file, or a CSV file in UTF-8 or ASCII",
                 "convert the file"});
        case Content::csv:
            break;
    }
    if (table) throw no_tables_in_csv(path, *table);
    return std::make_unique<CsvReader>(path, columns);
}

}  // namespace deviascope
