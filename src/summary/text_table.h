// SPDX-License-Identifier: GPL-2.0-or-later
// chain -> SUMMARY -> figures
#pragma once

#include <string>
#include <vector>

namespace deviascope {

/// Columns of a page of plain text.
inline constexpr std::size_t page_width = 100;

/// Letters (UTF-8 code points) of a text, not bytes.
std::size_t width_of(const std::string& text);

/// Text folded at blanks to the page, every line after `indent` blanks; words longer than a
/// line are cut. The first line begins with `lead` in place of the last blanks of its indent.
std::string folded(const std::string& text, std::size_t indent, const std::string& lead = "");

/// A heading of the page, folded, with a line of its own under it.
std::string heading(const std::string& text, char line = '-');

/// The warnings at the top of a page, numbered; a sentence where there are none.
std::string warnings_block(const std::vector<std::string>& warnings);

/// A table in aligned columns, two blanks in from the margin and three between columns.
/// A first cell that leaves no room for its row stands on a line of its own; a last column that
/// is aligned to the left is folded.
class TextTable {
  public:
    /// @param sides  one letter a column: `l` aligned to the left, `r` to the right
    explicit TextTable(std::string sides) : sides_(std::move(sides)) {}

    /// As many cells as columns, fewer where the rest is empty.
    void row(std::vector<std::string> cells);
    /// A line of hyphens under the rows so far.
    void rule();
    std::string text() const;

  private:
    std::vector<std::size_t> widths() const;
    std::string line(const std::vector<std::string>& cells,
                     const std::vector<std::size_t>& width) const;

    std::string sides_;
    std::vector<std::vector<std::string>> rows_;  ///< an empty row is a rule
};

}  // namespace deviascope
