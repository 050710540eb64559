// SPDX-License-Identifier: GPL-2.0-or-later
// CATALOGUE (private): a FITS binary table as a table
#pragma once

#include "core/fits/fits_file.h"
#include "deviascope/catalogue/table.h"

namespace deviascope {

/// Numbers of some columns of a FITS binary table. Rules and errors: `open_table`.
class FitsReader : public TableReader {
  public:
    FitsReader(const std::filesystem::path& path,
               const std::optional<std::string>& table,
               const std::vector<std::string>& columns);

    bool next(TableChunk& chunk) override;
    std::optional<std::int64_t> n_rows() const override { return table_.n_rows(); }
    std::string place_of_row(std::int64_t row) const override;
    std::string unit_of(std::size_t column) const override { return wanted_[column].unit; }

  private:
    fits::Table table_;
    std::vector<fits::Column> wanted_;
    std::int64_t n_read_ = 0;
};

}  // namespace deviascope
