// SPDX-License-Identifier: GPL-2.0-or-later
#pragma once

#include <stdlib.h>  // mkdtemp: POSIX, not in <cstdlib>

#include <filesystem>
#include <fstream>
#include <stdexcept>
#include <string>
#include <system_error>

namespace deviascope::test {

/// A folder of its own, removed with all it holds.
class TemporaryFolder {
  public:
    explicit TemporaryFolder(
        const std::filesystem::path& parent = std::filesystem::temp_directory_path()) {
        std::string name = (parent / "deviascope-test-XXXXXX").string();
        if (mkdtemp(name.data()) == nullptr)
            throw std::runtime_error("cannot make a temporary folder like " + name);
        path_ = name;
    }
    ~TemporaryFolder() {
        std::error_code ignored;
        std::filesystem::remove_all(path_, ignored);
    }
    TemporaryFolder(const TemporaryFolder&) = delete;
    TemporaryFolder& operator=(const TemporaryFolder&) = delete;

    const std::filesystem::path& path() const { return path_; }
    /// `folder / "name"`: the path of a file inside.
    std::filesystem::path operator/(const std::filesystem::path& name) const {
        return path_ / name;
    }
    /// Writes a file inside, byte for byte, and returns its path.
    std::filesystem::path write(const std::filesystem::path& name,
                                const std::string& text) const {
        std::ofstream file(path_ / name, std::ios::binary);
        file << text;
        if (!file.flush()) throw std::runtime_error("cannot write " + (path_ / name).string());
        return path_ / name;
    }

  private:
    std::filesystem::path path_;
};

}  // namespace deviascope::test
