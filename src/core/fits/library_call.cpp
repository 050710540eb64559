// SPDX-License-Identifier: GPL-2.0-or-later
#include "core/fits/library_call.h"

#include <fmt/format.h>

#include <array>

namespace deviascope::fits {

std::string library_words(int status) {
    std::array<char, FLEN_STATUS> text{};
    std::array<char, FLEN_ERRMSG> detail{};
    fits_get_errstatus(status, text.data());
    fits_read_errmsg(detail.data());
    fits_clear_errmsg();
    std::string words = fmt::format("CFITSIO says \"{}\"", text.data());
    if (detail[0] != '\0') words += fmt::format(" ({})", detail.data());
    return words;
}

std::string literal_name(const std::filesystem::path& path) {
    return path.is_absolute() ? path.string() : "./" + path.string();
}

void Closer::operator()(void* file) const noexcept {
    int status = 0;
    fits_close_file(static_cast<fitsfile*>(file), &status);
    fits_clear_errmsg();
}

std::string library_version() {
    return fmt::format("CFITSIO {}.{}.{}", CFITSIO_MAJOR, CFITSIO_MINOR, CFITSIO_MICRO);
}

}  // namespace deviascope::fits
