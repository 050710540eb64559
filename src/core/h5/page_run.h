// SPDX-License-Identifier: GPL-2.0-or-later
// CORE (private to this folder): pages on their way to the disk
#pragma once

#include <algorithm>
#include <cstdint>
#include <string>

#include "core/descriptor.h"
#include "core/h5/draft_file.h"

namespace deviascope::h5 {

/// Writes pages, given in ascending order, into a file that is to have a certain length;
/// neighbours go in one call. Errors: OutputError.
class PageRun {
  public:
    PageRun(const Descriptor& file, std::uint64_t length) : file_(file), length_(length) {}

    void add(std::uint64_t number, const Page& page) {
        const std::uint64_t offset = number * page_bytes;
        if (offset >= length_) return;
        if (offset != start_ + bytes_.size() || bytes_.size() >= longest) flush();
        if (bytes_.empty()) start_ = offset;
        bytes_.append(page.data(), std::min(page_bytes, length_ - offset));
    }

    /// After the last page. The end of the file may be a hole or lie before what was there.
    void end() {
        flush();
        if (file_.size() != length_) file_.resize(length_);
    }

  private:
    static constexpr std::size_t longest = std::size_t{1} << 20U;  // bytes

    void flush() {
        file_.write(bytes_, start_);
        bytes_.clear();
    }

    const Descriptor& file_;
    std::uint64_t length_;
    std::uint64_t start_ = 0;
    std::string bytes_;
};

}  // namespace deviascope::h5
