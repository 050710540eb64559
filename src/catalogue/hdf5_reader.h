// SPDX-License-Identifier: GPL-2.0-or-later
// CATALOGUE (private): datasets of an HDF5 group as a table
#pragma once

#include "core/h5/reader.h"
#include "deviascope/catalogue/table.h"

namespace deviascope {

/// Numbers of some columns of an HDF5 group, one dataset a column. Rules and errors:
/// `open_table`.
class Hdf5Reader : public TableReader {
  public:
    Hdf5Reader(const std::filesystem::path& path,
               const std::optional<std::string>& group,
               const std::vector<std::string>& columns);

    bool next(TableChunk& chunk) override;
    std::optional<std::int64_t> n_rows() const override { return n_rows_; }
    std::string place_of_row(std::int64_t row) const override;
    std::string unit_of(std::size_t column) const override;

  private:
    std::string default_group() const;
    std::string checked_group(const std::string& group) const;
    std::vector<std::string> datasets_of(const std::string& group) const;
    void check_lengths();

    h5::Reader file_;
    std::vector<std::string> wanted_;  // paths of the datasets asked for
    std::int64_t n_rows_ = 0;
    std::int64_t n_read_ = 0;
};

}  // namespace deviascope
