// SPDX-License-Identifier: GPL-2.0-or-later
#include "core/h5/pages.h"

#include <algorithm>
#include <string_view>

namespace deviascope::h5 {

char* Pages::find(std::uint64_t number) const {
    const auto found = by_number_.find(number);
    return found == by_number_.end() ? nullptr : found->second;
}

char* Pages::add(std::uint64_t number) {
    const std::size_t slab = by_number_.size() / pages_together;
    const std::size_t place = by_number_.size() % pages_together;
    if (slab == slabs_.size())
        slabs_.push_back(std::make_unique_for_overwrite<char[]>(pages_together * page_bytes));
    char* const page = slabs_[slab].get() + place * page_bytes;
    by_number_.emplace_hint(by_number_.end(), number, page);
    return page;
}

void Pages::clear() {
    by_number_.clear();
}

std::vector<std::uint64_t> Pages::numbers() const {
    std::vector<std::uint64_t> all;
    all.reserve(by_number_.size());
    for (const auto& [number, page] : by_number_) all.push_back(number);
    return all;
}

void Pages::write_to(const Descriptor& file, std::uint64_t length) const {
    std::uint64_t start = 0;
    std::string_view run;
    for (const auto& [number, page] : by_number_) {
        const std::uint64_t offset = number * page_bytes;
        if (offset >= length) break;
        const bool goes_on = page == run.data() + run.size() && offset == start + run.size();
        if (!goes_on) {
            file.write(run, start);
            start = offset;
            run = {page, 0};
        }
        run = {run.data(), run.size() + std::min(page_bytes, length - offset)};
    }
    file.write(run, start);
}

}  // namespace deviascope::h5
