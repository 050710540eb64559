// SPDX-License-Identifier: GPL-2.0-or-later
#include "core/h5/exchanged_file.h"

#include <fcntl.h>
#include <stdio.h>  // renameat2: Linux, not in <cstdio>
#include <unistd.h>

#include <cerrno>
#include <string>
#include <system_error>
#include <utility>
#include <vector>

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
    try {
        prepare_shadow();
        Writer writer(path_, &main_, std::move(last_.pages));
        edit(writer);
        last_ = writer.close();
        last_.write_to(shadow_);
        shadow_.sync();
        change_places();
    } catch (...) {
        drop_shadow();
        throw;
    }
}

void ExchangedFile::open_main() {
    if (!main_.is_open()) main_ = Descriptor(path_, O_RDWR);
    if (!main_.is_at(path_))
        throw OutputError({path_.string(),
                           "was removed or replaced while it was being written",
                           "only one process may write it",
                           ""});
}

/// Brings it to the content of the file.
void ExchangedFile::prepare_shadow() {
    if (shadow_.is_open() && shadow_.try_lock()) {
        last_.write_to(shadow_);
        return;
    }
    drop_shadow();
    make_shadow();
}

void ExchangedFile::make_shadow() {
    remove_quietly(shadow_path_);  // of a process that was cut off
    shadow_ = Descriptor(shadow_path_, O_RDWR | O_CREAT | O_EXCL);
    shadow_.try_lock();
    std::vector<char> piece(pages_together * page_bytes);
    for (std::uint64_t offset = 0, n = 0; (n = main_.read(piece, offset)) > 0; offset += n)
        shadow_.write({piece.data(), n}, offset);
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
}

}  // namespace deviascope::h5
