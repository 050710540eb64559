// SPDX-License-Identifier: GPL-2.0-or-later
#include "job/prior_search.h"

#include <optional>
#include <set>
#include <system_error>

#include "deviascope/job/job.h"
#include "job/text_file.h"

namespace deviascope {

namespace fs = std::filesystem;

std::vector<fs::path> prior_folders(const fs::path& job_folder) {
    std::vector<fs::path> folders{job_folder, job_folder / "priors"};
    std::error_code failure;
    const fs::path program = fs::read_symlink("/proc/self/exe", failure);
    if (!failure) {
        const fs::path installed = program.parent_path().parent_path();
        folders.push_back(installed / "share" / "deviascope" / "priors");
    }
    folders.emplace_back(DEVIASCOPE_SOURCE_PRIORS);
    return folders;
}

std::vector<std::string> known_priors(const fs::path& job_folder) {
    std::set<std::string> names;
    std::vector<fs::path> folders = prior_folders(job_folder);
    folders.erase(folders.begin());
    for (const fs::path& folder : folders) {
        std::error_code failure;
        for (const fs::directory_entry& entry : fs::directory_iterator(folder, failure)) {
            if (entry.path().extension() == ".toml") names.insert(entry.path().stem().string());
        }
    }
    return {names.begin(), names.end()};
}

std::optional<Companion> find_prior(const std::string& name, const fs::path& job_folder) {
    for (const fs::path& folder : prior_folders(job_folder)) {
        const fs::path path = folder / (name + ".toml");
        if (auto text = text_of_file(path)) return Companion{name, path.string(), *text};
    }
    return std::nullopt;
}

}  // namespace deviascope
