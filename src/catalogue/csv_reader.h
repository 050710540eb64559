// SPDX-License-Identifier: GPL-2.0-or-later
// CATALOGUE (private): CSV text as a table
#pragma once

#include "catalogue/csv_records.h"
#include "deviascope/catalogue/table.h"

namespace deviascope {

/// Numbers of some columns of a CSV file. Rules and errors: `open_table`.
class CsvReader : public TableReader {
  public:
    CsvReader(const std::filesystem::path& path, const std::vector<std::string>& columns);

    bool next(TableChunk& chunk) override;
    std::optional<std::int64_t> n_rows() const override { return {}; }
    std::string place_of_row(std::int64_t row) const override;
    std::string unit_of(std::size_t) const override { return {}; }

  private:
    void refuse_other_separators(std::size_t n_wanted) const;
    bool read_record();
    double number(std::size_t field) const;
    [[noreturn]] void refuse_ragged() const;
    [[noreturn]] void refuse_number(std::size_t field, const char* what) const;

    std::filesystem::path path_;
    CsvRecords records_;
    std::vector<std::string> names_;   // of all columns
    std::vector<std::size_t> wanted_;  // indices of the columns asked for
    std::vector<std::string_view> fields_;
    std::int64_t n_read_ = 0;      // rows
    std::int64_t empty_line_ = 0;  // first of the empty lines met, 0: none
};

}  // namespace deviascope
