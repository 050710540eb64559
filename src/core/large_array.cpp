// SPDX-License-Identifier: GPL-2.0-or-later
#include "deviascope/core/large_array.h"

#include <sys/mman.h>

namespace deviascope {
namespace {

constexpr std::size_t large_page_bytes = std::size_t{2} << 20U;

/// What is shorter would be rounded up to a page or two that it does not need.
bool deserves_large_pages(std::size_t n_bytes) {
    return n_bytes >= 2 * large_page_bytes;
}

}  // namespace

void* large_memory(std::size_t n_bytes) {
    if (!deserves_large_pages(n_bytes)) return ::operator new(n_bytes);
    void* const memory = ::operator new(n_bytes, std::align_val_t(large_page_bytes));
    ::madvise(memory, n_bytes, MADV_HUGEPAGE);  // if it refuses: smaller ones
    return memory;
}

void free_large_memory(void* memory, std::size_t n_bytes) noexcept {
    if (deserves_large_pages(n_bytes))
        ::operator delete(memory, std::align_val_t(large_page_bytes));
    else
        ::operator delete(memory);
}

}  // namespace deviascope
