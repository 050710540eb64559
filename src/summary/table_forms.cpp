// SPDX-License-Identifier: GPL-2.0-or-later
#include <fmt/format.h>
#include <fmt/ranges.h>

#include <array>
#include <utility>

#include "deviascope/summary/result_tables.h"
#include "summary/text_table.h"

namespace deviascope {
namespace {

std::string replaced(std::string text, const std::string& from, const std::string& to) {
    for (std::size_t at = 0; (at = text.find(from, at)) != std::string::npos; at += to.size())
        text.replace(at, from.size(), to);
    return text;
}

/// Digits set apart by blanks, in mathematics.
std::string latex_number(const std::string& digits) {
    return replaced(digits, " ", "\\,");
}

bool is_number(const std::string& text) {
    return !text.empty() && text.find_first_not_of("0123456789.- ") == std::string::npos &&
           text.find_first_of("0123456789") != std::string::npos;
}

std::string latex_cell(const Cell& cell) {
    if (!cell.up.empty() && cell.up == cell.down)
        return fmt::format("${} \\pm {}$", latex_number(cell.text), latex_number(cell.up));
    if (!cell.up.empty())
        return fmt::format("${}^{{+{}}}_{{-{}}}$",
                           latex_number(cell.text),
                           latex_number(cell.up),
                           latex_number(cell.down));
    if (const std::size_t to = cell.text.find(" to "); to != std::string::npos)
        return latex_cell(cell.text.substr(0, to)) + " to " +
               latex_cell(cell.text.substr(to + 4));
    return is_number(cell.text) ? fmt::format("${}$", latex_number(cell.text))
                                : latex_text(cell.text);
}

/// One line in Unicode.
std::string plain_cell(const Cell& cell) {
    const auto minus = [](std::string text) {
        return text.starts_with('-') && text.size() > 1 ? text.replace(0, 1, "−") : text;
    };
    if (!cell.up.empty() && cell.up == cell.down) return minus(cell.text) + " ± " + cell.up;
    if (!cell.up.empty()) return minus(cell.text) + " +" + cell.up + " −" + cell.down;
    return minus(cell.text);
}

std::string html_text(std::string text) {
    text = replaced(std::move(text), "&", "&amp;");
    text = replaced(std::move(text), "<", "&lt;");
    return replaced(std::move(text), ">", "&gt;");
}

}  // namespace

std::string latex_text(const std::string& text) {
    static const std::array<std::pair<std::string, std::string>, 22> signs{
        {{"\\", "\\textbackslash "},
         {"{", "\\{"},
         {"}", "\\}"},
         {"%", "\\%"},
         {"&", "\\&"},
         {"#", "\\#"},
         {"_", "\\_"},
         {"$", "\\$"},
         {"^", "\\textasciicircum{}"},
         {"~", "\\textasciitilde{}"},
         {"<", "\\textless{}"},
         {">", "\\textgreater{}"},
         {"10⁻³", "$10^{-3}$"},
         {"−", "$-$"},
         {"–", "--"},
         {"±", "$\\pm$"},
         {"°", "$^{\\circ}$"},
         {"β", "$\\beta$"},
         {"²", "$^{2}$"},
         {"…", "\\dots{}"},
         {"⁻³", "$^{-3}$"},
         {"×", "$\\times$"}}};
    std::string safe;
    for (std::size_t at = 0; at < text.size();) {
        const auto found = std::find_if(signs.begin(), signs.end(), [&](const auto& sign) {
            return text.compare(at, sign.first.size(), sign.first) == 0;
        });
        safe += found == signs.end() ? std::string(1, text[at]) : found->second;
        at += found == signs.end() ? 1 : found->first.size();
    }
    return safe;
}

std::string to_latex(const ResultTable& table) {
    std::vector<std::string> header;
    for (const std::string& name : table.header) header.push_back(latex_text(name));
    std::string text = fmt::format(
        "% Needs \\usepackage{{booktabs}}.\n\\begin{{table*}}\n\\centering\n"
        "\\caption{{{}}}\n\\label{{tab:{}}}\n\\renewcommand{{\\arraystretch}}{{1.25}}\n\\begin{{tabular}}{{{}}}\n\\toprule\n{} "
        "\\\\\n\\midrule\n",
        latex_text(table.caption),
        table.name,
        table.sides,
        fmt::join(header, " & "));
    for (const auto& row : table.rows) {
        std::vector<std::string> cells;
        for (const Cell& cell : row) cells.push_back(latex_cell(cell));
        text += fmt::format("{} \\\\\n", fmt::join(cells, " & "));
    }
    return text + "\\bottomrule\n\\end{tabular}\n\\end{table*}\n";
}

std::string latex_page(const std::vector<ResultTable>& tables, const std::string& method) {
    std::string text =
        "\\documentclass[10pt]{article}\n\\usepackage[utf8]{inputenc}\n"
        "\\usepackage{amsmath}\n\\usepackage{booktabs}\n"
        "\\usepackage[margin=15mm,landscape]{geometry}\n\\begin{document}\n";
    for (const ResultTable& table : tables) text += fmt::format("\\input{{{}}}\n", table.name);
    return text + fmt::format(
                      "\\input{{{}}}\n\\bibliographystyle{{plain}}\n"
                      "\\bibliography{{references}}\n\\end{{document}}\n",
                      method);
}

std::string to_markdown(const ResultTable& table) {
    std::string text = table.caption + "\n\n|";
    for (const std::string& name : table.header) text += fmt::format(" {} |", name);
    text += "\n|";
    for (const char side : table.sides) text += side == 'r' ? "---:|" : "---|";
    text += "\n";
    for (const auto& row : table.rows) {
        text += "|";
        for (const Cell& cell : row) text += fmt::format(" {} |", plain_cell(cell));
        text += "\n";
    }
    return text;
}

std::string to_html(const ResultTable& table) {
    std::string text =
        "<table>\n<caption>" + html_text(table.caption) + "</caption>\n<thead><tr>";
    for (std::size_t column = 0; column < table.header.size(); ++column)
        text += fmt::format("<th scope=\"col\"{}>{}</th>",
                            table.sides[column] == 'r' ? " class=\"r\"" : "",
                            html_text(table.header[column]));
    text += "</tr></thead>\n<tbody>\n";
    for (const auto& row : table.rows) {
        text += "<tr>";
        for (std::size_t column = 0; column < row.size(); ++column)
            text += column == 0 ? fmt::format("<th scope=\"row\">{}</th>",
                                              html_text(plain_cell(row[column])))
                                : fmt::format("<td{}>{}</td>",
                                              table.sides[column] == 'r' ? " class=\"r\"" : "",
                                              html_text(plain_cell(row[column])));
        text += "</tr>\n";
    }
    return text + "</tbody>\n</table>\n";
}

}  // namespace deviascope
