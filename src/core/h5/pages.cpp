// SPDX-License-Identifier: GPL-2.0-or-later
#include "core/h5/pages.h"

#include <algorithm>
#include <iterator>
#include <string_view>
#include <utility>

#include "deviascope/core/error.h"

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

// What is written past the cache begins where a page of the disk could.
static_assert(pages_together * page_bytes >= large_from_bytes);

}  // namespace

char* Pages::find(std::uint64_t number) const {
    auto run = runs_.upper_bound(number);
    if (run == runs_.begin()) return nullptr;
    --run;
    const std::uint64_t place = number - run->first;
    return place < run->second.n_pages ? run->second.memory + place * page_bytes : nullptr;
}

char* Pages::add(std::uint64_t number) {
    char* const page = take(1);
    place(number, {page, 1});
    return page;
}

char* Pages::reserve(std::size_t n_pages) {
    ensure(n_pages <= pages_together, "pages that are reserved together fit into a slab");
    if (reserved_.n_pages < n_pages) reserved_ = {take(n_pages), n_pages};
    return reserved_.memory;
}

bool Pages::adopt(const char* memory, std::uint64_t first, std::size_t n_pages) {
    if (memory != reserved_.memory || n_pages > reserved_.n_pages) return false;
    const auto next = runs_.lower_bound(first);
    if (find(first) != nullptr || (next != runs_.end() && next->first < first + n_pages))
        return false;
    place(first, {reserved_.memory, n_pages});
    reserved_ = {};
    return true;
}

/// Memory in one piece; what of a slab is too short for it is left.
char* Pages::take(std::size_t n_pages) {
    const std::size_t rest = pages_together - n_taken_ % pages_together;
    if (rest < n_pages) n_taken_ += rest;
    const std::size_t slab = n_taken_ / pages_together;
    if (slab == slabs_.size()) slabs_.emplace_back(pages_together * page_bytes);
    char* const memory = slabs_[slab].data() + n_taken_ % pages_together * page_bytes;
    n_taken_ += n_pages;
    return memory;
}

void Pages::place(std::uint64_t number, const Run& run) {
    const auto after = runs_.upper_bound(number);
    if (after != runs_.begin()) {
        auto& [first, before] = *std::prev(after);
        if (first + before.n_pages == number && before.end() == run.memory) {
            before.n_pages += run.n_pages;
            return;
        }
    }
    runs_.emplace_hint(after, number, run);
}

void Pages::clear() {
    runs_.clear();
    reserved_ = {};
    n_taken_ = 0;
}

void Pages::write_to(const Descriptor& file, std::uint64_t length) const {
    for (const auto& [first, run] : runs_) {
        const std::uint64_t offset = first * page_bytes;
        if (offset >= length) break;
        const std::size_t n_pages =
            std::min<std::uint64_t>(run.n_pages, pages_for(length - offset));
        write_run({run.memory, n_pages * page_bytes}, offset, file);
    }
}

}  // namespace deviascope::h5
