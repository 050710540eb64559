// SPDX-License-Identifier: GPL-2.0-or-later
#include "deviascope/figures/figures.h"

#include <fmt/format.h>
#include <fmt/ranges.h>

#include <algorithm>
#include <array>

#include "deviascope/core/nearest_name.h"
#include "figures/backends.h"
#include "figures/sheet.h"

namespace deviascope {
namespace {

constexpr double png_dots_per_inch = 240.0;

/// A figure's name (or what its names begin with) and what draws it, in the report's order.
struct Kind {
    const char* name;
    std::vector<Sheet> (*draw)(const FigureContext&);
};
constexpr std::array<Kind, 9> kinds = {{{"directions", direction_sheets},
                                        {"residuals", residual_sheets},
                                        {"amplitudes", amplitude_sheets},
                                        {"joint", joint_sheets},
                                        {"hypotheses", hypothesis_sheets},
                                        {"surveys", survey_sheets},
                                        {"profile", profile_sheets},
                                        {"weights", weight_sheets},
                                        {"traces", trace_sheets}}};

bool begins_either(const std::string& a, const std::string& b) {
    return a.starts_with(b) || b.starts_with(a);
}

bool is_wanted(const FigureOptions& options, const std::string& name) {
    return options.only.empty() ||
           std::any_of(options.only.begin(), options.only.end(), [&](const std::string& only) {
               return name.starts_with(only);
           });
}

/// Whether a kind can have a figure that is wanted.
bool may_be_wanted(const FigureOptions& options, const std::string& kind) {
    return options.only.empty() ||
           std::any_of(options.only.begin(), options.only.end(), [&](const std::string& only) {
               return begins_either(kind, only);
           });
}

void require_all_found(const FigureOptions& options, const std::vector<std::string>& names) {
    std::vector<Message> faults;
    for (const std::string& only : options.only) {
        const bool is_found = std::any_of(names.begin(), names.end(), [&](const auto& name) {
            return name.starts_with(only);
        });
        if (is_found) continue;
        const std::string nearest = nearest_name(only, names);
        faults.push_back({"--only",
                          fmt::format("this chain gives no figure \"{}\"", only),
                          fmt::format("{}", fmt::join(names, ", ")),
                          nearest.empty() ? "" : fmt::format("did you mean \"{}\"?", nearest)});
    }
    if (!faults.empty()) throw UsageError(faults);
}

Figure rendered(const Sheet& sheet, const Fonts& fonts) {
    Figure figure{sheet.name,
                  sheet.title,
                  sheet.reading_aid,
                  sheet.alternative,
                  {},
                  {},
                  {},
                  {},
                  sheet.csv};
    figure.svg =
        to_svg(sheet.drawing, fonts, {sheet.title, sheet.alternative, sheet.name + "-", false});
    figure.inlined_svg =
        to_svg(sheet.drawing, fonts, {sheet.title, sheet.alternative, sheet.name + "-", true});
    figure.pdf = to_pdf(sheet.drawing, fonts, sheet.title);
    figure.png = to_png(sheet.drawing, fonts, png_dots_per_inch);
    return figure;
}

}  // namespace

std::vector<std::string> figure_kinds() {
    std::vector<std::string> names;
    for (const Kind& kind : kinds) names.emplace_back(kind.name);
    return names;
}

void require_fonts(const std::filesystem::path& own) {
    static_cast<void>(Fonts(own));
}

std::vector<Message> FigureOptions::problems() const {
    std::vector<Message> found;
    if (!(width_mm >= 80.0 && width_mm <= 200.0))
        found.push_back({"--width",
                         fmt::format("{} mm", width_mm),
                         "80 mm (one column is 90mm) to 200 mm (two are 180mm)",
                         ""});
    const bool without_joint =
        !only.empty() && std::ranges::none_of(only, [](const std::string& name) {
            return begins_either(name, "joint");
        });
    if (!parameters.empty() && without_joint)
        found.push_back({"--parameters",
                         "they are of the joint figure, which --only leaves out",
                         "",
                         "add joint to --only"});
    return found;
}

std::vector<Figure> make_figures(const FigureSource& source, const FigureOptions& options) {
    if (const auto problems = options.problems(); !problems.empty()) throw UsageError(problems);
    const Fonts fonts(options.font);
    const FigureContext context{source, options, fonts};
    std::vector<Figure> figures;
    std::vector<std::string> names;
    for (const Kind& kind : kinds) {
        if (!may_be_wanted(options, kind.name)) {
            names.emplace_back(kind.name);
            continue;
        }
        for (const Sheet& sheet : kind.draw(context)) {
            names.push_back(sheet.name);
            if (is_wanted(options, sheet.name)) figures.push_back(rendered(sheet, fonts));
        }
    }
    require_all_found(options, names);
    return figures;
}

}  // namespace deviascope
