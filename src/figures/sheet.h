// SPDX-License-Identifier: GPL-2.0-or-later
// FIGURES, inside: what all figures have in common
#pragma once

#include <map>
#include <memory>
#include <string>
#include <vector>

#include "deviascope/figures/figures.h"
#include "figures/axis.h"
#include "figures/drawing.h"
#include "figures/fonts.h"
#include "figures/sky_panel.h"

namespace deviascope {

/// A figure before it is rendered.
struct Sheet {
    std::string name, title, reading_aid, alternative;
    Drawing drawing;
    std::string csv;
};

struct FigureContext {
    const FigureSource& source;
    const FigureOptions& options;
    const Fonts& fonts;
    /// Regions found so far, by vector and central longitude: several maps show the same ones.
    std::shared_ptr<std::map<std::pair<std::size_t, int>, std::vector<MapLines>>> regions =
        std::make_shared<std::map<std::pair<std::size_t, int>, std::vector<MapLines>>>();

    double width() const { return options.width_mm * 72.0 / 25.4; }
};

/// One vector as figures show it.
struct VectorSeries {
    std::size_t index = 0;  ///< in chain.vectors; also its place among the colours
    const VectorParameter* parameter = nullptr;
    const VectorSummary* summary = nullptr;
    std::string name;  ///< `velocity`, `intrinsic dipole`, `intrinsic dipole of dunlin`
    bool is_velocity() const { return index == 0; }
};
std::vector<VectorSeries> vector_series(const FigureSource& source);

/// An empty page with its title (unless bare); `top` is where the figure may begin.
struct Begun {
    Sheet sheet;
    double top;
};
Begun begin_sheet(const FigureContext& context,
                  const std::string& name,
                  const std::string& title);

/// Ends a page at `bottom`, with a caution where the run did not converge.
Sheet end_sheet(const FigureContext& context, Sheet sheet, double bottom);

/// Rows of a CSV file (RFC 4180): texts are quoted where need be, numbers have 10 digits.
class CsvText {
  public:
    explicit CsvText(const std::vector<std::string>& header);
    CsvText& text(const std::string& cell);
    CsvText& number(double cell);
    void end_row();
    const std::string& str() const { return text_; }

  private:
    void separate();
    std::string text_;
    bool is_first_ = true;
};

// One function a figure; a figure that has nothing to show makes no sheet.
std::vector<Sheet> direction_sheets(const FigureContext& context);
std::vector<Sheet> residual_sheets(const FigureContext& context);
std::vector<Sheet> amplitude_sheets(const FigureContext& context);
std::vector<Sheet> joint_sheets(const FigureContext& context);
std::vector<Sheet> profile_sheets(const FigureContext& context);
std::vector<Sheet> weight_sheets(const FigureContext& context);
std::vector<Sheet> trace_sheets(const FigureContext& context);
std::vector<Sheet> hypothesis_sheets(const FigureContext& context);
std::vector<Sheet> survey_sheets(const FigureContext& context);

}  // namespace deviascope
