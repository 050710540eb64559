// SPDX-License-Identifier: GPL-2.0-or-later
#include "counts/counts_group.h"

#include <fmt/format.h>

#include <algorithm>

#include "counts/moments_group.h"

namespace deviascope {

namespace {

// ---- names inside a group of counts, shared by writing and reading ----

std::string footprint_path(const std::string& survey, std::size_t footprint) {
    return fmt::format("{}/footprints/{}", survey, footprint + 1);
}

constexpr const char* counts_meaning =
    "sources counted in the pixels of a HEALPix grid (Gorski et al. 2005): one group a survey, "
    "in it its footprints (the pixels kept, and the exposure of each), its bins (sources in "
    "each of those pixels) and its table of cuts";

// ---- writing ----

void ensure_name(const std::string& name) {
    ensure(!name.empty() && name != "." && name != ".." &&
               name.find_first_of(std::string("/\0", 2)) == std::string::npos,
           "names of surveys and bins can be names in a file");
}

void write_footprint(h5::Writer& writer, const std::string& path, const Footprint& footprint) {
    const std::size_t n_pixels = footprint.pixel.size();
    ensure(footprint.exposure.size() == n_pixels, "each kept pixel has an exposure");
    writer.group(path, "the pixels kept under one exposure map; other pixels were cut");
    writer.dataset(path + "/pixel",
                   {"HEALPix pixel numbers, RING order, ascending", "1", "pixel"},
                   {n_pixels},
                   std::span<const std::int64_t>(footprint.pixel));
    writer.dataset(path + "/exposure",
                   {"completeness times unmasked fraction of each pixel, above 0, at most 1",
                    "1",
                    "pixel"},
                   {n_pixels},
                   std::span<const double>(footprint.exposure));
}

void write_bin(h5::Writer& writer,
               const std::string& survey_path,
               const SurveyCounts& survey,
               std::size_t order) {
    const BinCounts& bin = survey.bins[order];
    ensure_name(bin.name);
    ensure(bin.footprint < survey.footprints.size() &&
               bin.count.size() == survey.footprints[bin.footprint].pixel.size(),
           "a bin has a count for each pixel of its footprint");
    const std::string path = survey_path + "/bins/" + bin.name;
    writer.dataset(path,
                   {"sources of this bin in each pixel of its footprint", "1", "pixel"},
                   {bin.count.size()},
                   std::span<const std::uint32_t>(bin.count));
    writer.attribute(path, "order", static_cast<std::int64_t>(order + 1));
    writer.attribute(path, "footprint", static_cast<std::int64_t>(bin.footprint + 1));
}

void write_cuts(h5::Writer& writer, const std::string& path, const CutReport& report) {
    writer.group(
        path,
        "what each cut removed, in the order in which they acted: rows_read = sum of "
        "rows_removed + rows_kept, pixels_total = sum of pixels_removed + pixels_kept");
    writer.attribute(path, "rows_read", report.rows_read);
    writer.attribute(path, "rows_kept", report.rows_kept);
    writer.attribute(path, "pixels_total", report.pixels_total);
    writer.attribute(path, "pixels_kept", report.pixels_kept);
    std::vector<std::string> names;
    std::vector<std::int64_t> rows, pixels;
    for (const CutLine& cut : report.cuts) {
        names.push_back(cut.name);
        rows.push_back(cut.rows_removed);
        pixels.push_back(cut.pixels_removed);
    }
    writer.dataset(path + "/name", {"the cut, in the words of the job file", "", "cut"}, names);
    writer.dataset(path + "/rows_removed",
                   {"catalogue rows removed", "1", "cut"},
                   {rows.size()},
                   std::span<const std::int64_t>(rows));
    writer.dataset(path + "/pixels_removed",
                   {"pixels of the grid removed", "1", "cut"},
                   {pixels.size()},
                   std::span<const std::int64_t>(pixels));
    writer.dataset(path + "/warnings",
                   {"what deserves a second look, in plain sentences", "", "warning"},
                   report.warnings);
}

void write_survey(h5::Writer& writer, const std::string& path, const SurveyCounts& survey) {
    writer.group(path, "counts of one survey");
    writer.group(path + "/footprints",
                 "numbered from 1; bins that share an exposure map share a footprint");
    for (std::size_t footprint = 0; footprint < survey.footprints.size(); ++footprint)
        write_footprint(writer, footprint_path(path, footprint), survey.footprints[footprint]);
    writer.group(path + "/bins",
                 "one dataset a bin; its attribute `footprint` says which pixels it is on, "
                 "`order` its place in the job");
    for (std::size_t bin = 0; bin < survey.bins.size(); ++bin)
        write_bin(writer, path, survey, bin);
    write_moments(writer, path, survey);
    write_cuts(writer, path + "/cuts", survey.cuts);
}

// ---- reading ----

Frame read_frame(const h5::Reader& reader, const std::string& group) {
    const std::string name = reader.required_text(group, "frame");
    const auto frame = frame_of_name(name);
    if (!frame)
        throw reader.error(group + "@frame",
                           "\"" + name + "\"",
                           fmt::format("{} are allowed", fmt::join(frame_names(), ", ")));
    return *frame;
}

int read_nside(const h5::Reader& reader, const std::string& group) {
    const std::int64_t nside = reader.required_integer(group, "nside");
    if (!Pixelisation::is_valid_nside(nside))
        throw reader.error(group + "@nside", std::to_string(nside), "a power of two is needed");
    const std::string ordering = reader.required_text(group, "ordering");
    if (ordering != "RING")
        throw reader.error(group + "@ordering", "\"" + ordering + "\"", "RING is needed");
    return static_cast<int>(nside);
}

void check_footprint(const h5::Reader& reader,
                     const std::string& path,
                     const Footprint& footprint,
                     const Pixelisation& grid) {
    std::int64_t previous = -1;
    for (const std::int64_t pixel : footprint.pixel) {
        if (pixel <= previous || pixel >= grid.n_pixels())
            throw reader.error(path + "/pixel",
                               fmt::format("pixel {} after {}", pixel, previous),
                               fmt::format("ascending numbers below {}", grid.n_pixels()));
        previous = pixel;
    }
    for (const double exposure : footprint.exposure)
        if (!(exposure > 0.0 && exposure <= 1.0))
            throw reader.error(path + "/exposure",
                               fmt::format("{}", exposure),
                               "above 0 and at most 1 is allowed");
}

Footprint read_footprint(const h5::Reader& reader,
                         const std::string& path,
                         const Pixelisation& grid) {
    Footprint footprint;
    const h5::Shape shape = reader.shape(path + "/pixel", 1);
    footprint.pixel = reader.integers(path + "/pixel", shape);
    footprint.exposure = reader.reals(path + "/exposure", shape);
    check_footprint(reader, path, footprint, grid);
    return footprint;
}

BinCounts read_bin(const h5::Reader& reader,
                   const std::string& survey_path,
                   const std::string& name,
                   const std::vector<Footprint>& footprints) {
    const std::string path = survey_path + "/bins/" + name;
    const std::int64_t number = reader.required_integer(path, "footprint");
    if (number < 1 || static_cast<std::size_t>(number) > footprints.size())
        throw reader.error(path + "@footprint",
                           std::to_string(number),
                           fmt::format("1 … {} is allowed", footprints.size()));
    BinCounts bin;
    bin.name = name;
    bin.footprint = static_cast<std::size_t>(number - 1);
    bin.count = reader.naturals(path, {footprints[bin.footprint].pixel.size()});
    return bin;
}

CutReport read_cuts(const h5::Reader& reader, const std::string& path) {
    CutReport report;
    report.rows_read = reader.required_integer(path, "rows_read");
    report.rows_kept = reader.required_integer(path, "rows_kept");
    report.pixels_total = reader.required_integer(path, "pixels_total");
    report.pixels_kept = reader.required_integer(path, "pixels_kept");
    const h5::Shape shape = reader.shape(path + "/name", 1);
    const auto names = reader.texts(path + "/name", shape);
    const auto rows = reader.integers(path + "/rows_removed", shape);
    const auto pixels = reader.integers(path + "/pixels_removed", shape);
    for (std::size_t cut = 0; cut < names.size(); ++cut)
        report.cuts.push_back({names[cut], rows[cut], pixels[cut]});
    report.warnings = reader.texts(path + "/warnings", reader.shape(path + "/warnings", 1));
    return report;
}

/// Members of a group in the order of their attribute `order`: 1, 2, 3, …
std::vector<std::string> in_order(const h5::Reader& reader, const std::string& group) {
    const std::vector<std::string> names = reader.names(group);
    std::vector<std::string> ordered(names.size());
    for (const std::string& name : names) {
        const std::int64_t order = reader.required_integer(group + "/" + name, "order");
        if (order < 1 || static_cast<std::size_t>(order) > names.size() ||
            !ordered[static_cast<std::size_t>(order - 1)].empty())
            throw reader.error(group + "/" + name + "@order",
                               std::to_string(order),
                               fmt::format("each of 1 … {} once", names.size()));
        ordered[static_cast<std::size_t>(order - 1)] = name;
    }
    return ordered;
}

SurveyCounts read_survey(const h5::Reader& reader,
                         const std::string& path,
                         const std::string& name,
                         const Pixelisation& grid) {
    SurveyCounts survey;
    survey.name = name;
    const std::size_t n_footprints = reader.names(path + "/footprints").size();
    for (std::size_t footprint = 0; footprint < n_footprints; ++footprint)
        survey.footprints.push_back(
            read_footprint(reader, footprint_path(path, footprint), grid));
    for (const std::string& bin : in_order(reader, path + "/bins"))
        survey.bins.push_back(read_bin(reader, path, bin, survey.footprints));
    read_moments(reader, path, survey);
    survey.cuts = read_cuts(reader, path + "/cuts");
    return survey;
}

}  // namespace

void write_counts_group(h5::Writer& writer, const std::string& group, const Counts& counts) {
    writer.group(group, counts_meaning);
    writer.attribute(group, "nside", static_cast<std::int64_t>(counts.nside));
    writer.attribute(group, "ordering", std::string("RING"));
    writer.attribute(group, "frame", name_of(counts.frame));
    for (std::size_t survey = 0; survey < counts.surveys.size(); ++survey) {
        ensure_name(counts.surveys[survey].name);
        const std::string path = group + "/" + counts.surveys[survey].name;
        write_survey(writer, path, counts.surveys[survey]);
        writer.attribute(path, "order", static_cast<std::int64_t>(survey + 1));
    }
}

Counts read_counts_group(const h5::Reader& reader, const std::string& group) {
    Counts counts;
    counts.nside = read_nside(reader, group);
    counts.frame = read_frame(reader, group);
    const Pixelisation grid(counts.nside);
    for (const std::string& survey : in_order(reader, group))
        counts.surveys.push_back(read_survey(reader, group + "/" + survey, survey, grid));
    return counts;
}

}  // namespace deviascope
