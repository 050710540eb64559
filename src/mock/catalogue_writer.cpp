// SPDX-License-Identifier: GPL-2.0-or-later
#include "mock/catalogue_writer.h"

#include <fmt/format.h>

#include <algorithm>
#include <cerrno>
#include <cstring>
#include <fstream>
#include <iterator>
#include <span>

#include "core/fits/fits_file.h"
#include "deviascope/core/error.h"
#include "deviascope/core/version.h"

namespace deviascope {

namespace {

/// Columns of the catalogue after longitude and latitude: which values go there.
std::vector<Property> written_properties(const MockSurvey& survey) {
    std::vector<Property> properties;
    for (const PropertyColumn& column : survey.property_columns())
        properties.push_back(column.property);
    return properties;
}

std::vector<fits::TableWriter::NewColumn> fits_columns(const MockSurvey& survey) {
    std::vector<fits::TableWriter::NewColumn> columns = {{survey.lon_column(), "D", "deg"},
                                                         {survey.lat_column(), "D", "deg"}};
    const std::string form = survey.output.single_precision ? "E" : "D";
    for (const PropertyColumn& column : survey.property_columns())
        columns.push_back({column.name, form, ""});
    return columns;
}

class FitsCatalogue : public CatalogueWriter {
  public:
    FitsCatalogue(const std::filesystem::path& path,
                  const Scenario& scenario,
                  const MockSurvey& survey)
        : table_(path, survey.output.extension, fits_columns(survey)),
          properties_(written_properties(survey)) {
        table_.card("ORIGIN", "deviascope " + version(), "invented sources, a mock sky");
        table_.card("SEED", static_cast<std::int64_t>(scenario.seed), "of the mock sky");
        table_.card("SKYFRAME", name_of(survey.output.frame), "of the positions");
    }

    void write(const MockRows& rows) override {
        const std::size_t n = rows.size();
        lon_.resize(n);
        lat_.resize(n);
        for (std::size_t row = 0; row < n; ++row) {
            const LonLat position = lon_lat_of(rows.position[row]);
            lon_[row] = position.lon_deg;
            lat_[row] = position.lat_deg;
        }
        // Pieces that fit the library's buffers: columns of a table lie interleaved.
        constexpr std::size_t piece = 2048;
        for (std::size_t first = 0; first < n; first += piece)
            write_piece(rows, first, std::min(piece, n - first));
        n_written_ += static_cast<std::int64_t>(n);
    }

    void close() override { table_.close(); }

  private:
    void write_piece(const MockRows& rows, std::size_t first, std::size_t n) {
        const std::int64_t row = n_written_ + static_cast<std::int64_t>(first);
        const auto part = [&](const std::vector<double>& values) {
            return std::span<const double>(values).subspan(first, n);
        };
        table_.write(0, row, part(lon_));
        table_.write(1, row, part(lat_));
        for (std::size_t column = 0; column < properties_.size(); ++column)
            table_.write(column + 2, row, part(rows.of(properties_[column])));
    }

    fits::TableWriter table_;
    std::vector<Property> properties_;
    std::vector<double> lon_, lat_;
    std::int64_t n_written_ = 0;
};

/// A text file under a temporary name. Left unfinished, it is removed.
class PendingText {
  public:
    explicit PendingText(std::filesystem::path path)
        : path_(std::move(path)),
          temporary_(path_.string() + ".partial"),
          file_(temporary_, std::ios::binary | std::ios::trunc) {
        if (!file_) fail();
    }
    ~PendingText() {
        if (finished_) return;
        file_.close();
        std::error_code ignored;
        std::filesystem::remove(temporary_, ignored);
    }
    PendingText(const PendingText&) = delete;
    PendingText& operator=(const PendingText&) = delete;

    void write(std::string_view text) {
        file_.write(text.data(), static_cast<std::streamsize>(text.size()));
        if (!file_) fail();
    }
    void close() {
        file_.close();
        if (!file_) fail();
        std::error_code error;
        std::filesystem::rename(temporary_, path_, error);
        if (error) fail(error.message());
        finished_ = true;
    }

  private:
    [[noreturn]] void fail(const std::string& reason = std::strerror(errno)) const {
        throw OutputError({path_.string(),
                           fmt::format("cannot be written ({})", reason),
                           "a writable folder with room is needed",
                           ""});
    }

    std::filesystem::path path_, temporary_;
    std::ofstream file_;
    bool finished_ = false;
};

/// RFC 4180: quoted where the name holds a comma or a quote.
std::string csv_field(const std::string& name) {
    if (name.find_first_of(",\"") == std::string::npos) return name;
    std::string quoted = "\"";
    for (const char c : name) quoted += c == '"' ? std::string("\"\"") : std::string(1, c);
    return quoted + '"';
}

/// Numbers have the fewest digits that read back as the same number.
class CsvCatalogue : public CatalogueWriter {
  public:
    CsvCatalogue(const std::filesystem::path& path, const MockSurvey& survey)
        : file_(path),
          properties_(written_properties(survey)),
          single_precision_(survey.output.single_precision) {
        std::string header =
            csv_field(survey.lon_column()) + ',' + csv_field(survey.lat_column());
        for (const PropertyColumn& column : survey.property_columns())
            header += ',' + csv_field(column.name);
        file_.write(header + '\n');
    }

    void write(const MockRows& rows) override {
        fmt::memory_buffer text;
        for (std::size_t row = 0; row < rows.size(); ++row) {
            const LonLat position = lon_lat_of(rows.position[row]);
            fmt::format_to(
                std::back_inserter(text), "{},{}", position.lon_deg, position.lat_deg);
            for (const Property property : properties_) append(text, rows.of(property)[row]);
            text.push_back('\n');
        }
        file_.write({text.data(), text.size()});
    }

    void close() override { file_.close(); }

  private:
    void append(fmt::memory_buffer& text, double value) const {
        if (single_precision_)
            fmt::format_to(std::back_inserter(text), ",{}", static_cast<float>(value));
        else
            fmt::format_to(std::back_inserter(text), ",{}", value);
    }

    PendingText file_;
    std::vector<Property> properties_;
    bool single_precision_;
};

}  // namespace

std::unique_ptr<CatalogueWriter> open_catalogue(const std::filesystem::path& path,
                                                const Scenario& scenario,
                                                const MockSurvey& survey) {
    if (path.extension() == ".csv") return std::make_unique<CsvCatalogue>(path, survey);
    return std::make_unique<FitsCatalogue>(path, scenario, survey);
}

void write_text_file(const std::filesystem::path& path, const std::string& text) {
    PendingText file(path);
    file.write(text);
    file.close();
}

}  // namespace deviascope
