// SPDX-License-Identifier: GPL-2.0-or-later
#include "core/h5/pages.h"

#include <sys/mman.h>

#include <string_view>
#include <utility>

namespace deviascope::h5 {
namespace {

/// Longer runs are draws, which nobody reads soon; they would only cost the system memory.
constexpr std::size_t longest_cached = std::size_t{16} * page_bytes;

void write_run(std::string_view run, std::uint64_t offset, const Descriptor& file) {
    if (run.size() > longest_cached)
        file.write_past_cache(run, offset);
    else
        file.write(run, offset);
}

/// Asks the system for pages of its larger kind: fewer to be made, and to be named to the disk.
template <class Memory>
std::unique_ptr<Memory> on_large_pages(std::unique_ptr<Memory> memory) {
    ::madvise(memory.get(), sizeof(Memory), MADV_HUGEPAGE);  // if it refuses: smaller ones
    return memory;
}

}  // namespace

char* Pages::find(std::uint64_t number) const {
    const auto found = by_number_.find(number);
    return found == by_number_.end() ? nullptr : found->second;
}

char* Pages::add(std::uint64_t number) {
    const std::size_t slab = by_number_.size() / pages_together;
    const std::size_t place = by_number_.size() % pages_together;
    if (slab == slabs_.size())
        slabs_.push_back(on_large_pages(std::make_unique_for_overwrite<Slab>()));
    char* const page = slabs_[slab]->bytes + place * page_bytes;
    by_number_.emplace_hint(by_number_.end(), number, page);
    return page;
}

void Pages::clear() {
    by_number_.clear();
}

void Pages::write_to(const Descriptor& file, std::uint64_t length) const {
    std::uint64_t start = 0;
    std::string_view run;
    for (const auto& [number, page] : by_number_) {
        const std::uint64_t offset = number * page_bytes;
        if (offset >= length) break;
        const bool goes_on = page == run.data() + run.size() && offset == start + run.size();
        if (!goes_on) {
            write_run(run, start, file);
            start = offset;
            run = {page, 0};
        }
        run = {run.data(), run.size() + page_bytes};
    }
    write_run(run, start, file);
}

}  // namespace deviascope::h5
