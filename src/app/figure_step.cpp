// SPDX-License-Identifier: GPL-2.0-or-later
#include "app/figure_step.h"

#include <fmt/format.h>

#include "deviascope/chain/fingerprint.h"
#include "deviascope/figures/report.h"
#include "deviascope/summary/direction_densities.h"
#include "deviascope/summary/result_tables.h"
#include "deviascope/summary/sky_files.h"
#include "job/text_file.h"

namespace deviascope {

namespace fs = std::filesystem;

namespace {

/// What figures are made from, kept together.
struct Prepared {
    std::vector<std::optional<DirectionDensity>> directions;
    FigureSource source;

    Prepared(const ChainResults& results, int threads)
        : directions(direction_densities(results.chain, results.summarised.summary, threads)),
          source{results.chain,
                 results.summarised.space,
                 results.summarised.summary,
                 directions,
                 results.summarised.cmb_velocity,
                 results.chain.provenance.seed,
                 results.comparison ? &*results.comparison : nullptr} {}
};

void write_figures(const std::vector<Figure>& figures, const fs::path& folder) {
    make_folder(folder / "data");
    for (const Figure& figure : figures) {
        write_text(folder / (figure.name + ".svg"), figure.svg);
        write_text(folder / (figure.name + ".pdf"), figure.pdf);
        write_text(folder / (figure.name + ".png"), figure.png);
        write_text(folder / "data" / (figure.name + ".csv"), figure.csv);
    }
}

void write_tables(const Summary& summary, const Chain& chain, const fs::path& folder) {
    make_folder(folder);
    const std::vector<ResultTable> tables{results_table(summary), bins_table(summary)};
    for (const ResultTable& table : tables) {
        write_text(folder / (table.name + ".tex"), to_latex(table));
        write_text(folder / (table.name + ".md"), to_markdown(table));
        write_text(folder / (table.name + ".csv"), table.csv);
    }
    write_text(folder / "method.tex", method_text(summary, chain));
    write_text(folder / "references.bib", references_bib());
    write_text(folder / "page.tex", latex_page(tables, "method"));
}

}  // namespace

std::optional<Comparison> comparison_beside(const fs::path& chain_file,
                                            const Provenance& provenance,
                                            Terminal& terminal) {
    const fs::path path = chain_file.parent_path() / "compare.json";
    const std::optional<std::string> text = text_of_file(path);
    if (!text) return std::nullopt;
    try {
        Comparison comparison = comparison_of_json(*text, path.string());
        if (comparison.fingerprint == fingerprint_of(provenance)) return comparison;
        terminal.warn(path.string() +
                      " is of another job or other inputs: left out of figures and report");
    } catch (const InputError& fault) {
        terminal.warn(std::string(fault.what()) + "; left out of figures and report");
    }
    return std::nullopt;
}

void write_results(const ChainResults& results,
                   const FigureOptions& options,
                   const fs::path& folder,
                   Terminal& terminal) {
    const Prepared prepared(results, options.threads);
    const Summary& summary = results.summarised.summary;
    const std::vector<Figure> figures = make_figures(prepared.source, options);
    remove_results(folder, drawn_results(folder));
    write_figures(figures, folder / "figures");
    write_tables(summary, results.chain, folder / "tables");
    make_folder(folder / "sky");
    write_by([&] {
        write_sky_files({results.chain, results.summarised.space, summary, prepared.directions},
                        folder / "sky");
    });
    write_text(folder / "report.html", report_html(prepared.source, figures));
    terminal.say(fmt::format("Written: {} with figures/, tables/ and sky/ beside it.",
                             (folder / "report.html").string()));
}

void write_chosen_figures(const ChainResults& results,
                          const FigureOptions& options,
                          const fs::path& folder,
                          Existing existing,
                          Terminal& terminal) {
    const Prepared prepared(results, options.threads);
    const std::vector<Figure> figures = make_figures(prepared.source, options);
    std::vector<std::string> names;
    for (const Figure& figure : figures) names.push_back(figure.name + ".svg");
    prepare_output(folder / "figures", names, existing);
    write_figures(figures, folder / "figures");
    for (const Figure& figure : figures)
        terminal.say(fmt::format("Written: {}.svg, .pdf and .png",
                                 (folder / "figures" / figure.name).string()));
}

}  // namespace deviascope
