// SPDX-License-Identifier: GPL-2.0-or-later
#include "counts/moments_group.h"

#include <span>
#include <vector>

#include "counts/monomials.h"
#include "deviascope/core/digest.h"
#include "deviascope/counts/moments.h"

namespace deviascope {

namespace {

using Table = std::vector<const std::vector<double>*>;  ///< its rows

template <typename Number>
void add(const std::vector<Number>& numbers, Digest& digest) {
    const auto bytes = std::as_bytes(std::span(numbers));
    digest.add({reinterpret_cast<const unsigned char*>(bytes.data()), bytes.size()});
}

/// Of everything the moments of a survey are made from.
std::string digest_of_counts(const SurveyCounts& survey) {
    Digest digest;
    for (const Footprint& footprint : survey.footprints) {
        add(footprint.pixel, digest);
        add(footprint.exposure, digest);
    }
    for (const BinCounts& bin : survey.bins) {
        digest.add(std::to_string(bin.footprint) + " ");
        add(bin.count, digest);
    }
    return digest.hex();
}

bool is_complete(const Table& table, std::size_t n_moments) {
    for (const std::vector<double>* row : table)
        if (row->size() != n_moments) return false;
    return !table.empty();
}

void write_table(h5::Writer& writer,
                 const std::string& path,
                 const h5::About& about,
                 const Table& table) {
    std::vector<double> all;
    for (const std::vector<double>* row : table)
        all.insert(all.end(), row->begin(), row->end());
    writer.dataset(
        path, about, {table.size(), table.front()->size()}, std::span<const double>(all));
}

void cut(const std::vector<double>& all,
         std::size_t row,
         std::size_t n_moments,
         std::vector<double>& out) {
    const auto first = all.begin() + static_cast<std::ptrdiff_t>(row * n_moments);
    out.assign(first, first + static_cast<std::ptrdiff_t>(n_moments));
}

constexpr std::size_t n_exposure = n_monomials(moment_degree + 1);
constexpr std::size_t n_excess = n_monomials(moment_degree);

}  // namespace

void write_moments(h5::Writer& writer, const std::string& path, const SurveyCounts& survey) {
    Table exposure, excess;
    for (const Footprint& footprint : survey.footprints) exposure.push_back(&footprint.moment);
    for (const BinCounts& bin : survey.bins) excess.push_back(&bin.excess_moment);
    if (!is_complete(exposure, n_exposure) || !is_complete(excess, n_excess)) return;
    write_table(
        writer,
        path + "/exposure_moments",
        {"mean over the exposure of x^i y^j z^l, (x, y, z) the unit vector to the "
         "centre of the pixel; i + j + l = 0 ... 9, in each degree by falling i, then j",
         "1",
         "footprint x monomial"},
        exposure);
    write_table(writer,
                path + "/excess_moments",
                {"sum over the pixels of (sources - those of an isotropic sky of as many "
                 "sources) x^i y^j z^l; i + j + l = 0 ... 8, in the same order",
                 "1",
                 "bin x monomial"},
                excess);
    writer.attribute(path + "/excess_moments", "digest_of_counts", digest_of_counts(survey));
}

void read_moments(const h5::Reader& reader, const std::string& path, SurveyCounts& survey) {
    const std::string exposure_path = path + "/exposure_moments";
    const std::string excess_path = path + "/excess_moments";
    if (!reader.has(exposure_path) || !reader.has(excess_path)) return;
    if (reader.required_text(excess_path, "digest_of_counts") != digest_of_counts(survey))
        throw reader.error(excess_path,
                           "moments of other counts",
                           "moments must belong to the counts beside them",
                           "count anew with --replace");
    const std::vector<double> exposure =
        reader.reals(exposure_path, {survey.footprints.size(), n_exposure});
    const std::vector<double> excess =
        reader.reals(excess_path, {survey.bins.size(), n_excess});
    for (std::size_t row = 0; row < survey.footprints.size(); ++row)
        cut(exposure, row, n_exposure, survey.footprints[row].moment);
    for (std::size_t row = 0; row < survey.bins.size(); ++row)
        cut(excess, row, n_excess, survey.bins[row].excess_moment);
}

}  // namespace deviascope
