// SPDX-License-Identifier: GPL-2.0-or-later
// MOCK (private): beside the flow
#pragma once

#include <filesystem>
#include <memory>

#include "deviascope/mock/generate.h"

namespace deviascope {

/// A mock catalogue that is being written: under a temporary name until `close`.
/// Errors of all members: OutputError.
class CatalogueWriter {
  public:
    virtual ~CatalogueWriter() = default;
    virtual void write(const MockRows& rows) = 0;
    virtual void close() = 0;
};

/// Opens the catalogue of one survey: FITS or CSV by the ending of the path.
std::unique_ptr<CatalogueWriter> open_catalogue(const std::filesystem::path& path,
                                                const Scenario& scenario,
                                                const MockSurvey& survey);

/// Writes a text under a temporary name, then puts it in place.
void write_text_file(const std::filesystem::path& path, const std::string& text);

}  // namespace deviascope
