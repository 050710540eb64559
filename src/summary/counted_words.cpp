// SPDX-License-Identifier: GPL-2.0-or-later
#include "summary/counted_words.h"

#include <fmt/format.h>

#include "deviascope/core/grouped_number.h"

namespace deviascope {

std::int64_t total_sources(const Summary& summary) {
    std::int64_t sources = 0;
    for (const BinSummary& bin : summary.bins) sources += bin.sources;
    return sources;
}

std::string count_of(std::size_t n, const std::string& one, const std::string& many) {
    return fmt::format("{} {}", n, n == 1 ? one : many);
}

std::string counted_words(const Summary& summary) {
    return fmt::format("{} sources in {} of {}",
                       grouped(total_sources(summary)),
                       count_of(summary.bins.size(), "bin", "bins"),
                       count_of(summary.survey_names.size(), "survey", "surveys"));
}

}  // namespace deviascope
