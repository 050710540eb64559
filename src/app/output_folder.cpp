// SPDX-License-Identifier: GPL-2.0-or-later
#include "app/output_folder.h"

#include <fmt/format.h>
#include <fmt/ranges.h>

#include <algorithm>
#include <cerrno>
#include <fstream>
#include <set>
#include <system_error>

#include "deviascope/core/error.h"
#include "deviascope/figures/figures.h"

namespace deviascope {

namespace fs = std::filesystem;

namespace {

/// Those of the files that are in the folder.
std::vector<std::string> present_in(const fs::path& folder,
                                    const std::vector<std::string>& files) {
    std::vector<std::string> present;
    for (const std::string& file : files) {
        std::error_code failure;
        const fs::file_status status = fs::symlink_status(folder / file, failure);
        if (fs::is_directory(status))
            throw OutputError({(folder / file).string(),
                               "a folder stands where a result goes",
                               "",
                               "move it away, or name another folder with -o"});
        if (fs::exists(status)) present.push_back(file);
    }
    return present;
}

OutputError cannot_write(const fs::path& path, const std::string& reason) {
    return OutputError(
        {path.string(),
         fmt::format("cannot be written ({})", reason),
         "a writable folder with room",
         "free some space; a chain that is there is safe, and `run` goes on with "
         "--resume, `summarise` with --replace"});
}

}  // namespace

fs::path folder_of(const CommandOptions& options) {
    if (!options.output.empty()) return options.output;
    return options.input.stem().string() + "-results";
}

Existing existing_of(const CommandOptions& options) {
    if (options.resume) return Existing::keep;
    return options.replace ? Existing::replace : Existing::refuse;
}

void make_folder(const fs::path& folder) {
    std::error_code failure;
    fs::create_directories(folder, failure);
    std::error_code ignored;
    if (fs::is_directory(folder, ignored)) return;
    const std::string reason = failure ? failure.message() : "a file of that name is there";
    throw OutputError({folder.string(),
                       fmt::format("the folder cannot be made ({})", reason),
                       "a folder that can be made or written to",
                       "name another one with -o"});
}

void prepare_output(const fs::path& folder,
                    const std::vector<std::string>& files,
                    Existing existing) {
    make_folder(folder);
    const std::vector<std::string> present = present_in(folder, files);
    if (existing != Existing::refuse || present.empty()) return;
    throw OutputError({folder.string(),
                       fmt::format("already holds {}", fmt::join(present, ", ")),
                       "nothing that exists is overwritten unasked",
                       "give --replace, or another folder with -o; --resume goes on with a run "
                       "that was cut off"});
}

void refuse_misfit(const Message& message, Existing existing) {
    if (existing == Existing::keep) throw UsageError(message);
    throw OutputError(message);
}

std::vector<std::string> drawn_results(const fs::path& folder) {
    struct Place {
        const char* name;
        std::vector<std::string> beginnings, endings;
    };
    const std::vector<Place> places{
        {".", {"report"}, {".html"}},
        {"figures", figure_kinds(), {".svg", ".pdf", ".png"}},
        {"figures/data", figure_kinds(), {".csv"}},
        {"tables",
         {"results", "bins", "method", "page", "references"},
         {".tex", ".md", ".csv", ".bib"}},
        {"sky", {"direction-", "region68-", "region95-", "residuals-"}, {".fits"}}};
    std::vector<std::string> found;
    for (const Place& place : places) {
        std::error_code failure;
        for (const auto& entry : fs::directory_iterator(folder / place.name, failure)) {
            const std::string name = entry.path().filename().string();
            const bool begins = std::ranges::any_of(
                place.beginnings, [&](const auto& b) { return name.starts_with(b); });
            const bool ends = std::ranges::any_of(
                place.endings, [&](const auto& e) { return name.ends_with(e); });
            if (begins && ends)
                found.push_back((fs::path(place.name) / name).lexically_normal());
        }
    }
    std::ranges::sort(found);
    return found;
}

std::vector<std::string> first_drawn_results(const fs::path& folder) {
    std::vector<std::string> firsts;
    std::set<fs::path> places;
    for (const std::string& file : drawn_results(folder))
        if (places.insert(fs::path(file).parent_path()).second) firsts.push_back(file);
    return firsts;
}

void remove_results(const fs::path& folder, const std::vector<std::string>& files) {
    for (const std::string& file : present_in(folder, files)) {
        std::error_code failure;
        fs::remove(folder / file, failure);
        if (failure) throw cannot_write(folder / file, failure.message());
    }
}

void write_by(const std::function<void()>& writer) {
    try {
        writer();
    } catch (const OutputError& failure) {
        const Message& what = failure.messages().front();
        throw cannot_write(what.place, what.found);
    }
}

void write_text(const fs::path& path, const std::string& text) {
    const fs::path temporary = path.string() + ".tmp";
    std::ofstream file(temporary, std::ios::binary);
    file << text;
    file.close();
    std::error_code failure(errno, std::generic_category());
    if (file) fs::rename(temporary, path, failure);
    if (file && !failure) return;
    std::error_code ignored;
    fs::remove(temporary, ignored);
    throw cannot_write(path, failure.message());
}

}  // namespace deviascope
