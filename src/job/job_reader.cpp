// SPDX-License-Identifier: GPL-2.0-or-later
#include <fmt/format.h>

#include <algorithm>
#include <limits>
#include <utility>

#include "deviascope/job/job.h"
#include "deviascope/sky/pixelisation.h"
#include "job/deduplication_reader.h"
#include "job/ensemble_reader.h"
#include "job/frame_reader.h"
#include "job/prior_reader.h"
#include "job/surroundings.h"
#include "job/survey_reader.h"
#include "job/text_file.h"
#include "job/toml_reader.h"

namespace deviascope {

namespace {

/// Up to a degree: what lies farther apart is not the same source.
const NumberRange match_range = above_up_to(0.0, 3600.0);
constexpr std::int64_t largest_integer = std::numeric_limits<std::int64_t>::max();

/// Hypotheses that every comparison knows already.
const std::vector<std::string> built_in_hypotheses = {
    "reference", "reference-intrinsic", "free", "free-intrinsic"};

int read_nside(const TomlTable& table) {
    const std::string allowed = "a power of two from 1 to 1024";
    if (!table.has("nside")) {
        table.fault("nside", "missing", allowed + " is required");
        return 0;
    }
    const auto nside = table.integer("nside", 1, largest_integer);
    if (!nside) return 0;
    if (*nside <= 1024 && Pixelisation::is_valid_nside(*nside)) return static_cast<int>(*nside);
    table.wrong("nside", allowed);
    return 0;
}

/// Reads a job's tables in turn; the parts that later ones need are members.
class JobReader {
  public:
    JobReader(const std::string& text, const std::string& name, Surroundings surroundings)
        : document_(text, name), root_(document_.root()), around_(std::move(surroundings)) {
        job_.text = text;
    }

    Job read() {
        read_job_table();
        job_.model.monopole = read_monopole(root_.table("monopole"));
        read_velocity();
        read_intrinsic();
        read_surveys();
        const auto n =
            model_complete_ ? std::optional(n_coordinates_of(job_.model)) : std::nullopt;
        const TomlTable ensemble = root_.table("ensemble");
        job_.model.engine = read_engine(ensemble);
        job_.ensemble = read_ensemble(ensemble, n);
        job_.ensemble.seed = job_.seed;
        read_hypotheses();
        document_.finish();
        job_.companions = around_.companions();
        job_.inputs = around_.inputs();
        return std::move(job_);
    }

  private:
    void read_job_table() {
        const TomlTable table = root_.table("job");
        job_.title = table.text("title").value_or("");
        job_.seed = static_cast<std::uint64_t>(
            table.integer("seed", 0, largest_integer, required).value_or(0));
        job_.nside = read_nside(table);
        job_.frame = read_frame(table, "frame").value_or(Frame::galactic);
        table.texts("deduplicate");  // understood once the surveys are known
        job_.match_arcsec = table.number("match_arcsec", match_range).value_or(5.0);
    }

    void read_velocity() {
        const auto prior =
            around_.read_prior(root_.table("velocity"), "prior", job_.frame, required);
        if (prior) job_.model.velocity = *prior;
        model_complete_ = model_complete_ && prior;
    }

    void read_intrinsic() {
        const TomlTable table = root_.table("intrinsic");
        job_.model.intrinsic_shared = table.boolean("shared").value_or(false);
        intrinsic_ = around_.read_prior(table, "prior", job_.frame, required);
        if (intrinsic_) job_.model.intrinsic = *intrinsic_;
        model_complete_ = model_complete_ && intrinsic_;
    }

    void read_surveys() {
        NameRule names({"all", "joint", "velocity"});
        const auto tables = root_.tables("survey", required);
        for (const TomlTable& table : tables) {
            SurveyReading survey = read_survey(
                table, names, intrinsic_, job_.model.intrinsic_shared, job_.frame, around_);
            job_.surveys.push_back(std::move(survey.input));
            job_.model.surveys.push_back(std::move(survey.model));
            job_.weighing.push_back(std::move(survey.weighing));
            for (std::string& warning : survey.warnings) {
                job_.warnings.push_back(std::move(warning));
            }
            for (const std::size_t bin : survey.measure_dispersion)
                job_.measure_dispersion.push_back({job_.surveys.size() - 1, bin});
            model_complete_ = model_complete_ && survey.model_complete;
        }
        job_.deduplicate = read_deduplication(root_.table("job"), job_.surveys);
        model_complete_ = model_complete_ && !tables.empty();
    }

    void read_hypotheses() {
        NameRule names(built_in_hypotheses);
        for (const TomlTable& table : root_.tables("hypothesis")) {
            Hypothesis hypothesis;
            hypothesis.name = names.read(table);
            const TomlTable velocity = table.table("velocity");
            const TomlTable intrinsic = table.table("intrinsic");
            if (velocity)
                hypothesis.velocity =
                    around_.read_prior(velocity, "prior", job_.frame, required);
            if (intrinsic) {
                hypothesis.intrinsic_shared = intrinsic.boolean("shared").value_or(false);
                hypothesis.intrinsic =
                    around_.read_prior(intrinsic, "prior", job_.frame, required);
            }
            job_.hypotheses.push_back(std::move(hypothesis));
        }
    }

    TomlDocument document_;
    TomlTable root_;
    Surroundings around_;
    Job job_;
    std::optional<VectorPrior> intrinsic_;
    bool model_complete_ = true;
};

Job named(Job job, const std::string& file_name) {
    job.name = file_name;
    if (job.title.empty()) job.title = file_name;
    return job;
}

Job read_text(const std::filesystem::path& path,
              const std::string& text,
              Surroundings surroundings) {
    Job job = JobReader(text, path.string(), std::move(surroundings)).read();
    job.folder = path.parent_path();
    return named(std::move(job), path.filename().string());
}

Job read_file(const std::filesystem::path& path, Surroundings surroundings) {
    const auto text = text_of_file(path);
    if (!text) {
        throw UsageError({path.string(),
                          "cannot be read",
                          "a job file (TOML) is required",
                          "check the path and its permissions"});
    }
    return read_text(path, *text, std::move(surroundings));
}

}  // namespace

bool Job::is_unmeasured() const {
    return std::ranges::any_of(weighing, &SurveyWeighing::unmeasured);
}

Job read_job(const std::filesystem::path& path) {
    return read_file(path, Surroundings::on_disk(path.parent_path()));
}

Job read_job(const std::filesystem::path& path, const std::string& text) {
    return read_text(path, text, Surroundings::on_disk(path.parent_path()));
}

Job read_job_to_weigh(const std::filesystem::path& path) {
    Surroundings around = Surroundings::on_disk(path.parent_path());
    around.pass_over_weights();
    return read_file(path, std::move(around));
}

Job completed(const Job& job, const std::vector<Companion>& measured) {
    const std::string path = (job.folder / job.name).string();
    Job whole = JobReader(job.text, path, Surroundings::on_disk(job.folder, measured)).read();
    whole.folder = job.folder;
    return named(std::move(whole), job.name);
}

std::string name_of_measured_weights(const std::string& survey) {
    return "measured weights of " + survey;
}

Job parse_job(const std::string& text,
              const std::string& name,
              const CompanionFinder& companions) {
    return named(JobReader(text, name, Surroundings::kept(companions)).read(), name);
}

}  // namespace deviascope
