// SPDX-License-Identifier: GPL-2.0-or-later
// CORE (private to this folder): the border to the HDF5 library. H5::Exception does not derive
// from std::exception and says little; the library's own error stack says more, but is gone
// once another call is made. So the innermost words are kept at the moment of failure.
#pragma once

#include <H5Cpp.h>

#include <filesystem>
#include <string>
#include <utility>

#include "core/h5/dataset.h"

namespace deviascope::h5 {

/// While it lives, the words of failures are kept; before and after, the library is silent (one
/// that has someone to talk to complains when the program ends).
class Listening {
  public:
    Listening();
    ~Listening();
    Listening(const Listening&) = delete;
    Listening& operator=(const Listening&) = delete;
};

/// Why the last call failed, in the library's and the system's words.
std::string reason_of(const H5::Exception& exception);

/// Runs `call`; where the library fails, throws what `error_of(reason)` returns.
template <class Call, class ErrorOf>
auto translated(Call&& call, ErrorOf&& error_of) {
    const Listening listening;
    try {
        return std::forward<Call>(call)();
    } catch (const H5::Exception& exception) {
        throw error_of(reason_of(exception));
    }
}

/// Throws (an H5::Exception) where a call of the C interface failed.
template <class Status>
Status checked(Status status, const char* call) {
    if (status < 0) throw H5::Exception(call, "failed");
    return status;
}

/// Fixed-length text, UTF-8, padded with zero bytes. Not variable-length: the heap of those has
/// no checksum, so that damage would go unnoticed.
H5::StrType text_type(std::size_t n_bytes);

Shape shape_of(const H5::DataSpace& space);
std::vector<hsize_t> extents(const Shape& shape);

}  // namespace deviascope::h5
