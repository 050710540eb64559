// SPDX-License-Identifier: GPL-2.0-or-later
#include <system_error>

#include "core/fits/fits_file.h"
#include "core/fits/library_call.h"
#include "deviascope/core/error.h"

namespace deviascope::fits {

TableWriter::TableWriter(const std::filesystem::path& path,
                         const std::string& extension_name,
                         const std::vector<NewColumn>& columns)
    : path_(path), temporary_(path.string() + ".partial") {
    std::error_code ignored;
    std::filesystem::remove(temporary_, ignored);  // left by a run that was killed
    int status = 0;
    fitsfile* file = nullptr;
    fits_create_diskfile(&file, literal_name(temporary_).c_str(), &status);
    file_.reset(file);
    check(status);
    std::vector<char*> names, forms, units;
    for (const NewColumn& column : columns) {  // the library reads them, through char*
        names.push_back(const_cast<char*>(column.name.c_str()));
        forms.push_back(const_cast<char*>(column.form.c_str()));
        units.push_back(const_cast<char*>(column.unit.c_str()));
    }
    fits_create_tbl(file,
                    BINARY_TBL,
                    0,
                    int(columns.size()),
                    names.data(),
                    forms.data(),
                    units.data(),
                    extension_name.c_str(),
                    &status);
    if (status != 0) {
        file_.reset();
        std::filesystem::remove(temporary_, ignored);
    }
    check(status);
}

TableWriter::~TableWriter() {
    if (!file_) return;
    file_.reset();
    std::error_code ignored;
    std::filesystem::remove(temporary_, ignored);
}

void TableWriter::check(int status) const {
    if (status == 0) return;
    throw OutputError({path_.string(),
                       library_words(status),
                       "",
                       "check that the folder exists, may be written to and has space"});
}

void TableWriter::card(const std::string& keyword,
                       const std::string& value,
                       const std::string& comment) {
    int status = 0;
    fits_update_key_longstr(
        raw(file_), keyword.c_str(), value.c_str(), comment.c_str(), &status);
    check(status);
}

void TableWriter::card(const std::string& keyword,
                       std::int64_t value,
                       const std::string& comment) {
    int status = 0;
    fits_update_key_lng(raw(file_), keyword.c_str(), value, comment.c_str(), &status);
    check(status);
}

void TableWriter::card(const std::string& keyword, double value, const std::string& comment) {
    int status = 0;
    fits_update_key_dbl(raw(file_), keyword.c_str(), value, -15, comment.c_str(), &status);
    check(status);
}

void TableWriter::write(std::size_t column,
                        std::int64_t first,
                        std::span<const double> values) {
    int status = 0;
    fits_write_col_dbl(raw(file_),
                       int(column) + 1,
                       first + 1,
                       1,
                       LONGLONG(values.size()),
                       const_cast<double*>(values.data()),
                       &status);
    check(status);
}

void TableWriter::write(std::size_t column,
                        std::int64_t first,
                        std::span<const std::int64_t> values) {
    static_assert(sizeof(LONGLONG) == sizeof(std::int64_t));
    int status = 0;
    fits_write_col(raw(file_),
                   TLONGLONG,
                   int(column) + 1,
                   first + 1,
                   1,
                   LONGLONG(values.size()),
                   const_cast<std::int64_t*>(values.data()),
                   &status);
    check(status);
}

void TableWriter::close() {
    ensure(file_ != nullptr, "a FITS table is closed once");
    int status = 0;
    fits_close_file(static_cast<fitsfile*>(file_.release()), &status);
    std::error_code failure;
    if (status == 0) {
        std::filesystem::rename(temporary_, path_, failure);
        if (!failure) return;
    }
    std::error_code ignored;
    std::filesystem::remove(temporary_, ignored);
    check(status);
    throw OutputError({path_.string(), failure.message(), "", "check what is at this path"});
}

}  // namespace deviascope::fits
