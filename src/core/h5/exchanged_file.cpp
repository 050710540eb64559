// SPDX-License-Identifier: GPL-2.0-or-later
#include "core/h5/exchanged_file.h"

#include <fcntl.h>
#include <stdio.h>  // renameat2: Linux, not in <cstdio>
#include <unistd.h>

#include <cerrno>
#include <numeric>
#include <string>
#include <system_error>
#include <utility>

#include "core/h5/draft_file.h"

namespace deviascope::h5 {

namespace fs = std::filesystem;

namespace {

fs::path beside(fs::path path, const char* ending) {
    path += ending;
    return path;
}

void remove_quietly(const fs::path& path) noexcept {
    std::error_code ignored;  // it is not there, or stays as harmless litter
    fs::remove(path, ignored);
}

/// Whether the file system (or kernel) does not know how to exchange.
bool cannot_exchange(int reason) {
    return reason == EINVAL || reason == ENOSYS || reason == EOPNOTSUPP;
}

}  // namespace

void remove_leftovers(const fs::path& path) noexcept {
    for (const char* ending : {".tmp", ".next", ".old"}) remove_quietly(beside(path, ending));
}

ExchangedFile::ExchangedFile(const fs::path& path)
    : path_(path), shadow_path_(beside(path, ".next")), old_path_(beside(path, ".old")) {}

ExchangedFile::~ExchangedFile() {
    drop_shadow();
}

void ExchangedFile::change(const Edit& edit) {
    open_main();
    Writer writer(path_, &main_, std::move(room_));
    edit(writer);
    Draft draft = writer.close();
    try {
        prepare_shadow();
        write_shadow(draft);
        change_places();
    } catch (...) {
        drop_shadow();
        throw;
    }
    stale_ = draft.pages.numbers();
    room_ = std::move(draft.pages);
}

void ExchangedFile::open_main() {
    if (!main_.is_open()) main_ = Descriptor(path_, O_RDWR);
    if (!main_.is_at(path_))
        throw OutputError({path_.string(),
                           "was removed or replaced while it was being written",
                           "only one process may write it",
                           ""});
}

void ExchangedFile::prepare_shadow() {
    if (shadow_.is_open() && shadow_.try_lock()) return;
    drop_shadow();
    remove_quietly(shadow_path_);  // of a process that was cut off
    shadow_ = Descriptor(shadow_path_, O_RDWR | O_CREAT | O_EXCL);
    shadow_.try_lock();
    const std::uint64_t n_pages = (main_.size() + page_bytes - 1) / page_bytes;
    stale_.resize(n_pages);
    std::iota(stale_.begin(), stale_.end(), std::uint64_t{0});
}

void ExchangedFile::write_shadow(const Draft& draft) {
    // What it once held beyond the end of the file must not come back when the file grows.
    if (shadow_.size() > main_.size()) shadow_.resize(main_.size());
    copy_stale_pages(draft);
    draft.write_to(shadow_);
    shadow_.sync();
}

/// All in which the shadow lags, but for those about to change; neighbours go together.
void ExchangedFile::copy_stale_pages(const Draft& draft) {
    copied_.resize(pages_together * page_bytes);
    std::erase_if(stale_,
                  [&](std::uint64_t page) { return draft.pages.find(page) != nullptr; });
    for (std::size_t done = 0; done < stale_.size();) {
        std::size_t n = 1;
        while (n < pages_together && done + n < stale_.size() &&
               stale_[done + n] == stale_[done] + n)
            ++n;
        const std::uint64_t offset = stale_[done] * page_bytes;
        const std::size_t n_read = main_.read({copied_.data(), n * page_bytes}, offset);
        shadow_.write({copied_.data(), n_read}, offset);
        done += n;
    }
}

void ExchangedFile::change_places() {
    shadow_.unlock();
    bool have_exchanged =
        ::renameat2(AT_FDCWD, shadow_path_.c_str(), AT_FDCWD, path_.c_str(), RENAME_EXCHANGE) ==
        0;
    if (!have_exchanged) {
        if (!cannot_exchange(errno)) throw system_error(path_, "cannot be replaced");
        // A second name keeps the old file for the next change; it may be refused.
        const bool is_kept = ::link(path_.c_str(), old_path_.c_str()) == 0;
        if (::rename(shadow_path_.c_str(), path_.c_str()) != 0)
            throw system_error(path_, "cannot be replaced");
        have_exchanged = is_kept && ::rename(old_path_.c_str(), shadow_path_.c_str()) == 0;
        if (!have_exchanged) remove_quietly(old_path_);
    }
    main_ = std::exchange(shadow_, have_exchanged ? std::move(main_) : Descriptor());
    sync_folder_of(path_);
}

void ExchangedFile::drop_shadow() noexcept {
    if (shadow_.is_open()) remove_quietly(shadow_path_);
    remove_quietly(old_path_);
    shadow_ = Descriptor();
    stale_.clear();
}

}  // namespace deviascope::h5
