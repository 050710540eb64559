// SPDX-License-Identifier: GPL-2.0-or-later
// chain -> SUMMARY -> figures
#pragma once

#include <string>
#include <vector>

#include "deviascope/chain/chain.h"
#include "deviascope/summary/summary.h"

namespace deviascope {

/// One cell: a text, or a number with the errors that say how many digits it deserves (two
/// digits of half its 68 % interval; common practice).
struct Cell {
    std::string text;  ///< plain, in Unicode; for a measured number its value, rounded
    std::string up{},
        down{};  ///< distances to the ends of its 68 % interval, rounded, unsigned
    Cell(std::string words) : text(std::move(words)) {}
    Cell(const char* words) : text(words) {}
    Cell(std::string value, std::string above, std::string below)
        : text(std::move(value)), up(std::move(above)), down(std::move(below)) {}
};

struct ResultTable {
    std::string name;     ///< of its files: `results`, `bins`
    std::string caption;  ///< with what a reader must know: intervals, priors
    std::string sides;    ///< one letter a column: `l` or `r`
    std::vector<std::string> header;
    std::vector<std::vector<Cell>> rows;
    std::string csv;  ///< the same rows with all digits, units in the header
};

/// Velocity and intrinsic dipoles: amplitude, interval, prior's own median, direction, region.
ResultTable results_table(const Summary& summary);
/// Bins: sources, pixels, monopoles, kinematic weights.
ResultTable bins_table(const Summary& summary);

/// A fragment for \input (booktabs rules), and the page around fragments that compiles.
std::string to_latex(const ResultTable& table);
std::string latex_page(const std::vector<ResultTable>& tables, const std::string& method);
std::string to_markdown(const ResultTable& table);
/// A `<table>` with its caption.
std::string to_html(const ResultTable& table);

/// Plain text as it may stand in LaTeX, Unicode signs that the program uses included.
std::string latex_text(const std::string& text);

/// A few sentences for the methods section, filled with the run's numbers, with \cite keys of
/// `references_bib`.
/// Whether velocity and intrinsic dipoles are told apart, as a sentence: the joint verdict of
/// the separation, or that there is nothing to separate.
std::string separation_sentence(const Summary& summary);
std::string method_text(const Summary& summary, const Chain& chain);
/// BibTeX entries of what `method_text` cites.
std::string references_bib();

}  // namespace deviascope
