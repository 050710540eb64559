// SPDX-License-Identifier: GPL-2.0-or-later
#include "job/surroundings.h"

#include <fmt/format.h>

#include <algorithm>
#include <system_error>

#include "job/prior_reader.h"
#include "job/prior_search.h"
#include "job/text_file.h"

namespace deviascope {

namespace fs = std::filesystem;

namespace {

/// Names are file names without their `.toml`.
bool is_prior_name(const std::string& name) {
    return name.find('/') == std::string::npos && !name.ends_with(".toml");
}

}  // namespace

Surroundings Surroundings::on_disk(const fs::path& folder,
                                   const std::vector<Companion>& measured) {
    Surroundings disk;
    disk.find_measured_ = [measured](const std::string& name) -> std::optional<Companion> {
        const auto found = std::ranges::find(measured, name, &Companion::name);
        return found != measured.end() ? std::optional(*found) : std::nullopt;
    };
    disk.folder_ = folder;
    disk.look_for_inputs_ = true;
    disk.find_prior_ = [folder](const std::string& name) { return find_prior(name, folder); };
    disk.find_file_ = [folder](const std::string& written) -> std::optional<Companion> {
        const fs::path path = folder / written;
        const auto text = text_of_file(path);
        return text ? std::optional(Companion{written, path.string(), *text}) : std::nullopt;
    };
    disk.known_priors_ = [folder] { return known_priors(folder); };
    return disk;
}

Surroundings Surroundings::kept(const CompanionFinder& companions) {
    Surroundings texts;
    texts.find_prior_ = companions;
    texts.find_file_ = companions;
    texts.find_measured_ = companions;
    texts.known_priors_ = [] { return std::vector<std::string>{}; };
    return texts;
}

void Surroundings::keep(const Companion& companion) {
    const bool known =
        std::any_of(companions_.begin(), companions_.end(), [&](const Companion& c) {
            return c.name == companion.name;
        });
    if (!known) companions_.push_back(companion);
}

fs::path Surroundings::resolved(const std::string& written) const {
    return folder_ / written;
}

std::optional<VectorPrior> Surroundings::named_prior(const TomlTable& table,
                                                     const std::string& key,
                                                     Frame job_frame) {
    const auto name = table.text(key, required);
    if (!name) return std::nullopt;
    if (!is_prior_name(*name)) {
        table.wrong(key,
                    "the name of a prior, without folder and .toml,",
                    "put the file beside the job or into its priors/");
        return std::nullopt;
    }
    const auto companion = find_prior_(*name);
    if (!companion) {
        const auto known = known_priors_();
        const std::string names = known.empty() ? "" : ", " + listed(known) + ",";
        table.wrong(key, "a known prior" + names, suggestion(*name, known));
        return std::nullopt;
    }
    keep(*companion);
    try {
        return parse_prior(*companion, job_frame);
    } catch (const UsageError& error) {
        table.adopt(key, error.messages());
        return std::nullopt;
    }
}

std::optional<VectorPrior> Surroundings::read_prior(const TomlTable& table,
                                                    const std::string& key,
                                                    Frame job_frame,
                                                    Presence presence) {
    if (table.has_text(key)) return named_prior(table, key, job_frame);
    if (table.has_table(key)) return read_vector_prior(table.table(key), "", job_frame);
    const std::string allowed = "the name of a prior or a table { kind = … }";
    if (table.has(key)) table.wrong(key, allowed);
    if (!table.has(key) && presence == required) {
        table.fault(key, "missing", allowed + " is required");
    }
    return std::nullopt;
}

std::optional<Companion> Surroundings::read_companion(const TomlTable& table,
                                                      const std::string& key) {
    const auto written = table.text(key);
    if (!written) return std::nullopt;
    const auto companion = written->ends_with(".toml") ? find_file_(*written) : std::nullopt;
    if (companion) {
        keep(*companion);
        return companion;
    }
    table.fault(key,
                fmt::format("there is no file \"{}\"", resolved(*written).string()),
                "a readable file whose name ends in .toml is allowed",
                "relative paths start at the job file's folder");
    return std::nullopt;
}

std::optional<Companion> Surroundings::measured_weights(const std::string& survey) {
    const auto companion = find_measured_(name_of_measured_weights(survey));
    if (companion) keep(*companion);
    return companion;
}

fs::path Surroundings::input(const TomlTable& table,
                             const std::string& key,
                             const std::string& written) {
    const fs::path path = resolved(written);
    const bool known = std::any_of(
        inputs_.begin(), inputs_.end(), [&](const InputFile& i) { return i.path == path; });
    if (!known) inputs_.push_back({written, path});
    std::error_code failure;
    if (!look_for_inputs_ || fs::is_regular_file(path, failure)) return path;
    const bool is_there = fs::exists(path, failure);
    table.fault(
        key,
        fmt::format("\"{}\" {}", path.string(), is_there ? "is not a file" : "does not exist"),
        "a file that exists is allowed",
        "relative paths start at the job file's folder");
    return path;
}

std::optional<fs::path> Surroundings::optional_input(const TomlTable& table,
                                                     const std::string& key) {
    const auto written = table.text(key);
    return written ? std::optional(input(table, key, *written)) : std::nullopt;
}

}  // namespace deviascope
