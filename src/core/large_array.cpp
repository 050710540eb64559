// SPDX-License-Identifier: GPL-2.0-or-later
#include "deviascope/core/large_array.h"

#include <sys/mman.h>

namespace deviascope {

void* large_memory(std::size_t n_bytes) {
    if (n_bytes < large_from_bytes) return ::operator new(n_bytes);
    void* const memory = ::operator new(n_bytes, std::align_val_t(large_page_bytes));
    ::madvise(memory, n_bytes, MADV_HUGEPAGE);  // if it refuses: smaller ones
    return memory;
}

void free_large_memory(void* memory, std::size_t n_bytes) noexcept {
    if (n_bytes < large_from_bytes)
        ::operator delete(memory);
    else
        ::operator delete(memory, std::align_val_t(large_page_bytes));
}

}  // namespace deviascope
