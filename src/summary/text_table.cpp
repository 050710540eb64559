// SPDX-License-Identifier: GPL-2.0-or-later
#include "summary/text_table.h"

#include <fmt/format.h>

#include <algorithm>
#include <numeric>

#include "deviascope/core/error.h"

namespace deviascope {
namespace {

constexpr std::size_t margin = 2, gap = 3;

bool begins_letter(char byte) {
    return (static_cast<unsigned char>(byte) & 0xC0u) != 0x80u;
}

std::string blanks(std::size_t n) {
    return std::string(n, ' ');
}

/// Cuts words longer than `width` into pieces.
std::vector<std::string> words_of(const std::string& text, std::size_t width) {
    std::vector<std::string> words(1);
    std::size_t length = 0;
    for (const char byte : text) {
        const bool is_blank = byte == ' ' || byte == '\n';
        if (is_blank || (begins_letter(byte) && length == width)) {
            words.emplace_back();
            length = 0;
        }
        if (is_blank) continue;
        words.back() += byte;
        length += begins_letter(byte) ? 1 : 0;
    }
    std::erase(words, "");
    return words;
}

std::vector<std::string> lines_of(const std::string& text, std::size_t width) {
    std::vector<std::string> lines(1);
    for (const std::string& word : words_of(text, width)) {
        if (!lines.back().empty() && width_of(lines.back()) + 1 + width_of(word) > width)
            lines.emplace_back();
        if (!lines.back().empty()) lines.back() += ' ';
        lines.back() += word;
    }
    return lines;
}

/// The lines of a text, without blanks at their ends.
void append_lines(const std::string& text, std::vector<std::string>& lines) {
    std::size_t begin = 0;
    for (std::size_t end = 0; (end = text.find('\n', begin)) != std::string::npos;
         begin = end + 1) {
        std::string line = text.substr(begin, end - begin);
        line.erase(line.find_last_not_of(' ') + 1);
        lines.push_back(std::move(line));
    }
}

}  // namespace

std::size_t width_of(const std::string& text) {
    return static_cast<std::size_t>(std::count_if(text.begin(), text.end(), begins_letter));
}

std::string folded(const std::string& text, std::size_t indent, const std::string& lead) {
    std::string result;
    for (const std::string& line : lines_of(text, page_width - indent)) {
        const bool is_first = result.empty();
        const std::size_t taken = is_first ? std::min(width_of(lead), indent) : 0;
        result += blanks(indent - taken) + (is_first ? lead : "") + line + "\n";
    }
    return result;
}

void TextTable::row(std::vector<std::string> cells) {
    ensure(!cells.empty() && cells.size() <= sides_.size(), "a row fits its table");
    cells.resize(sides_.size());
    rows_.push_back(std::move(cells));
}

void TextTable::rule() {
    rows_.emplace_back();
}

std::vector<std::size_t> TextTable::widths() const {
    std::vector<std::size_t> width(sides_.size(), 0);
    for (const auto& cells : rows_)
        for (std::size_t column = 0; column < cells.size(); ++column)
            width[column] = std::max(width[column], width_of(cells[column]));
    const std::size_t last = width.size() - 1;
    const std::size_t taken = margin + gap * last;
    constexpr std::size_t least_folded = 30;
    if (sides_[last] == 'l') width[last] = std::min(width[last], least_folded);
    const std::size_t others =
        std::accumulate(width.begin() + 1, width.end(), std::size_t{0}) + taken;
    width[0] = std::min(width[0], others < page_width ? page_width - others : 0);
    if (sides_[last] == 'l')
        width[last] = page_width - taken - std::accumulate(width.begin(), width.end() - 1, 0UL);
    return width;
}

std::string TextTable::line(const std::vector<std::string>& cells,
                            const std::vector<std::size_t>& width) const {
    std::string head, body = blanks(margin);
    const std::size_t last = cells.size() - 1;
    for (std::size_t column = 0; column <= last; ++column) {
        if (column > 0) body += blanks(gap);
        if (column == last && last > 0 && sides_[last] == 'l')
            return head + body + folded(cells[last], width_of(body)).substr(width_of(body));
        std::string cell = cells[column];
        if (width_of(cell) > width[column]) {
            head = folded(cell, margin);
            cell.clear();
        }
        const std::string padding = blanks(width[column] - width_of(cell));
        body += sides_[column] == 'l' ? cell + padding : padding + cell;
    }
    return head + body + "\n";
}

std::string TextTable::text() const {
    const std::vector<std::size_t> width = widths();
    std::vector<std::string> lines;
    for (const auto& cells : rows_)
        if (cells.empty())
            lines.emplace_back();
        else
            append_lines(line(cells, width), lines);
    std::size_t longest = 0;
    for (const std::string& text : lines) longest = std::max(longest, width_of(text));
    std::string result;
    for (const std::string& text : lines)
        result +=
            (text.empty() ? blanks(margin) + std::string(longest - margin, '-') : text) + "\n";
    return result;
}

std::string heading(const std::string& text, char line) {
    const std::size_t longest = std::min(width_of(text), page_width);
    return folded(text, 0) + std::string(longest, line) + "\n";
}

std::string warnings_block(const std::vector<std::string>& warnings) {
    if (warnings.empty()) return "No warnings.\n";
    std::string text = heading(fmt::format("WARNINGS ({})", warnings.size()), '!');
    for (std::size_t number = 0; number < warnings.size(); ++number)
        text += folded(warnings[number], 5, fmt::format("{:>2}.  ", number + 1));
    return text;
}

}  // namespace deviascope
