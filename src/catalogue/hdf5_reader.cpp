// SPDX-License-Identifier: GPL-2.0-or-later
#include "catalogue/hdf5_reader.h"

#include <fmt/format.h>

#include <algorithm>
#include <span>

#include "catalogue/column_match.h"
#include "catalogue/reading.h"

namespace deviascope {

namespace {

std::string inside(const std::string& group, const std::string& member) {
    return group == "/" ? group + member : group + "/" + member;
}

}  // namespace

Hdf5Reader::Hdf5Reader(const std::filesystem::path& path,
                       const std::optional<std::string>& group,
                       const std::vector<std::string>& columns)
    : file_(path) {
    const std::string place = group ? checked_group(*group) : default_group();
    const std::vector<std::string> names = datasets_of(place);
    if (names.empty()) {
        throw file_.error(place,
                          "the group holds no dataset",
                          "one dataset a column, all in one group",
                          "name the group with `table`");
    }
    for (const std::string& column : columns)
        wanted_.push_back(inside(place, names[match_column(path, column, names)]));
    check_lengths();
}

/// A group as the job file names it: with or without the slash in front or behind.
std::string Hdf5Reader::checked_group(const std::string& group) const {
    const std::size_t first = group.find_first_not_of('/');
    if (first == std::string::npos) return "/";
    const std::size_t last = group.find_last_not_of('/');
    const std::string path =
        fmt::format("/{}", std::string_view(group).substr(first, last - first + 1));
    if (file_.is_group(path)) return path;
    std::string present;
    for (const std::string& name : file_.names("/"))
        if (file_.is_group("/" + name)) present += (present.empty() ? "" : ", ") + name;
    throw file_.error("",
                      fmt::format("there is no group `{}`", group),
                      present.empty() ? "the file has the root group only"
                                      : "the groups of its root are " + present,
                      "name a group of the file, or leave `table` out");
}

/// The root group; where it holds no dataset and one group only, that.
std::string Hdf5Reader::default_group() const {
    const std::vector<std::string> members = file_.names("/");
    return members.size() == 1 && file_.is_group("/" + members[0]) ? "/" + members[0] : "/";
}

std::vector<std::string> Hdf5Reader::datasets_of(const std::string& group) const {
    std::vector<std::string> datasets;
    for (const std::string& name : file_.names(group))
        if (file_.is_dataset(inside(group, name))) datasets.push_back(name);
    return datasets;
}

void Hdf5Reader::check_lengths() {
    for (const std::string& column : wanted_) {
        const std::size_t n = file_.column_length(column);
        if (&column == &wanted_.front()) n_rows_ = static_cast<std::int64_t>(n);
        if (static_cast<std::int64_t>(n) == n_rows_) continue;
        throw file_.error(column,
                          fmt::format("it holds {} values", n),
                          fmt::format("{}, as {}", n_rows_, wanted_.front()),
                          "name columns of one table");
    }
}

bool Hdf5Reader::next(TableChunk& chunk) {
    const std::int64_t n = std::min(rows_per_chunk, n_rows_ - n_read_);
    chunk.first_row = n_read_;
    chunk.column.resize(wanted_.size());
    for (std::size_t i = 0; i < wanted_.size(); ++i) {
        chunk.column[i].resize(static_cast<std::size_t>(n));
        file_.read(wanted_[i], static_cast<std::size_t>(n_read_), chunk.column[i]);
    }
    n_read_ += n;
    return n > 0;
}

std::string Hdf5Reader::place_of_row(std::int64_t row) const {
    return fmt::format("row {}", row + 1);
}

std::string Hdf5Reader::unit_of(std::size_t column) const {
    for (const char* name : {"unit", "units"})
        if (const auto unit = file_.text_if_any(wanted_[column], name)) return *unit;
    return {};
}

}  // namespace deviascope
