// SPDX-License-Identifier: GPL-2.0-or-later
#include "core/h5/replaced_file.h"

#include <fcntl.h>
#include <unistd.h>

#include <cerrno>
#include <string_view>
#include <system_error>
#include <utility>

namespace deviascope::h5 {

namespace fs = std::filesystem;

namespace {

/// An error of the last system call.
OutputError failure(const fs::path& path, const std::string& what) {
    const std::error_code reason(errno, std::generic_category());
    return OutputError({path.string(), what + ": " + reason.message(), "", ""});
}

/// An open file or folder.
class Descriptor {
  public:
    Descriptor(const fs::path& path, int flags)
        : path_(path), number_(::open(path.c_str(), flags | O_CLOEXEC, 0666)) {
        if (number_ < 0) throw failure(path, "cannot be opened");
    }
    ~Descriptor() {
        if (number_ >= 0) ::close(number_);
    }
    Descriptor(const Descriptor&) = delete;
    Descriptor& operator=(const Descriptor&) = delete;

    void write(std::string_view bytes) {
        while (!bytes.empty()) {
            const ssize_t n_written = ::write(number_, bytes.data(), bytes.size());
            if (n_written < 0 && errno == EINTR) continue;
            if (n_written < 0) throw failure(path_, "cannot be written");
            bytes.remove_prefix(static_cast<std::size_t>(n_written));
        }
    }

    std::string read() {
        std::string bytes;
        std::string piece(std::size_t{1} << 20U, '\0');
        while (true) {
            const ssize_t n_read = ::read(number_, piece.data(), piece.size());
            if (n_read < 0 && errno == EINTR) continue;
            if (n_read < 0) throw failure(path_, "cannot be read");
            if (n_read == 0) return bytes;
            bytes.append(piece, 0, static_cast<std::size_t>(n_read));
        }
    }

    /// Has the system put it on the disk.
    void sync() {
        if (::fsync(number_) != 0) throw failure(path_, "cannot be put on the disk");
    }

    /// Some file systems report failed writes only here.
    void close() {
        const int number = std::exchange(number_, -1);
        if (::close(number) != 0) throw failure(path_, "cannot be closed");
    }

  private:
    fs::path path_;
    int number_;
};

void write_durably(const fs::path& path, const std::string& bytes) {
    Descriptor file(path, O_WRONLY | O_CREAT | O_TRUNC);
    file.write(bytes);
    file.sync();
    file.close();
}

void rename_durably(const fs::path& from, const fs::path& to) {
    if (::rename(from.c_str(), to.c_str()) != 0) throw failure(to, "cannot be replaced");
    const fs::path folder = to.parent_path();
    Descriptor(folder.empty() ? fs::path(".") : folder, O_RDONLY | O_DIRECTORY).sync();
}

void put_in_place(const fs::path& path, const std::string& bytes) {
    fs::path temporary = path;
    temporary += ".tmp";
    try {
        write_durably(temporary, bytes);
        rename_durably(temporary, path);
    } catch (...) {
        std::error_code ignored;  // the first error is the one to tell
        fs::remove(temporary, ignored);
        throw;
    }
}

std::string edited(const fs::path& path, const std::string& image, const Edit& edit) {
    Writer writer(path, image);
    edit(writer);
    return writer.close();
}

}  // namespace

void write_file(const fs::path& path, const Edit& fill) {
    put_in_place(path, edited(path, {}, fill));
}

void change_file(const fs::path& path, const Edit& change) {
    const std::string before = Descriptor(path, O_RDONLY).read();
    put_in_place(path, edited(path, before, change));
}

}  // namespace deviascope::h5
