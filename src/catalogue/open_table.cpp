// SPDX-License-Identifier: GPL-2.0-or-later
#include <fmt/format.h>

#include <algorithm>
#include <cerrno>
#include <cstring>
#include <fstream>
#include <set>

#include "catalogue/csv_reader.h"
#include "catalogue/fits_reader.h"
#include "catalogue/reading.h"
#include "deviascope/catalogue/table.h"

namespace deviascope {

namespace {

enum class Content { fits, csv, gzip, hdf5, binary };

/// The first bytes of a file. Errors: InputError.
std::string first_bytes(const std::filesystem::path& path) {
    if (std::filesystem::is_directory(path)) throw cannot_read(path, "it is a folder");
    std::ifstream file(path, std::ios::binary);
    if (!file) throw cannot_read(path, std::strerror(errno));
    std::string bytes(4096, '\0');
    file.read(bytes.data(), static_cast<std::streamsize>(bytes.size()));
    if (file.bad()) throw cannot_read(path, std::strerror(errno));
    bytes.resize(static_cast<std::size_t>(file.gcount()));
    return bytes;
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

InputError not_yet_available(const std::filesystem::path& path,
                             const char* what,
                             const char* remedy) {
    return InputError({path.string(),
                       fmt::format("this is {}; reading it is not yet available", what),
                       "a FITS binary table or a CSV file",
                       remedy});
}

InputError no_tables_in_csv(const std::filesystem::path& path, const std::string& table) {
    return InputError({path.string(),
                       fmt::format("table `{}` was asked for in a CSV file", table),
                       "a table is named in FITS files only",
                       "remove `table`"});
}

}  // namespace

std::unique_ptr<TableReader> open_table(const std::filesystem::path& path,
                                        const std::optional<std::string>& table,
                                        const std::vector<std::string>& columns) {
    ensure(std::set(columns.begin(), columns.end()).size() == columns.size(),
           "a column is asked for once only");
    switch (content_of(first_bytes(path))) {
        case Content::fits:
            return std::make_unique<FitsReader>(path, table, columns);
        case Content::gzip:
            throw not_yet_available(path, "a gzip-compressed file", "uncompress it first");
        case Content::hdf5:
            throw not_yet_available(path, "an HDF5 file", "convert it to FITS or CSV");
        case Content::binary:
            throw InputError({path.string(),
                              "the content is neither a FITS file nor plain text",
                              "a FITS binary table or a CSV file in UTF-8 or ASCII",
                              "convert the file"});
        case Content::csv:
            break;
    }
    if (table) throw no_tables_in_csv(path, *table);
    return std::make_unique<CsvReader>(path, columns);
}

}  // namespace deviascope
