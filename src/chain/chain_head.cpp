// SPDX-License-Identifier: GPL-2.0-or-later
#include <limits>

#include "chain/chain_layout.h"
#include "chain/chain_sections.h"
#include "chain/columns.h"
#include "counts/counts_group.h"

namespace deviascope {

namespace {

using h5::Shape;
using h5::Writer;

void write_inputs(Writer& writer, const std::vector<InputDigest>& inputs) {
    writer.group("/job/inputs", "files the counts were made from");
    writer.dataset("/job/inputs/path",
                   {"as the job file names it", "", "input"},
                   column_of(inputs, &InputDigest::path));
    writer.dataset("/job/inputs/sha256",
                   {"SHA-256 of its bytes", "", "input"},
                   column_of(inputs, &InputDigest::sha256));
    const auto sizes = column_of(inputs, &InputDigest::bytes);
    writer.dataset(
        "/job/inputs/bytes", {"size", "byte", "input"}, {sizes.size()}, all_of(sizes));
}

void write_companions(Writer& writer, const std::vector<Companion>& companions) {
    writer.group("/job/companions", "prior and weights files the job depends on, whole");
    writer.dataset("/job/companions/name",
                   {"as the job file names it", "", "file"},
                   column_of(companions, &Companion::name));
    writer.dataset("/job/companions/path",
                   {"where it was found", "", "file"},
                   column_of(companions, &Companion::path));
    writer.dataset("/job/companions/text",
                   {"its text", "", "file"},
                   column_of(companions, &Companion::text));
}

void write_options(Writer& writer, const EnsembleOptions& options) {
    const std::string place = "/job/sampler";
    writer.group(place, "what was asked of the sampler; 0 means: chosen by the program");
    writer.attribute(place, "replicates", std::int64_t{options.replicates});
    writer.attribute(place, "walkers", std::int64_t{options.walkers});
    writer.attribute(place, "effective_draws", options.effective_draws);
    writer.attribute(place, "max_steps", options.max_steps);
    writer.attribute(place, "store_every", options.store_every);
    writer.attribute(place, "fraction.stretch", options.kernels.stretch);
    writer.attribute(
        place, "fraction.differential-evolution", options.kernels.differential_evolution);
    writer.attribute(place, "fraction.independence", options.kernels.independence);
}

void write_job(Writer& writer, const Provenance& job, const EnsembleOptions& options) {
    ensure(job.seed <= std::numeric_limits<std::int64_t>::max(), "a seed is below 2^63");
    writer.group("/job", "where the chain comes from: enough to make it again");
    writer.attribute("/job", "name", job.job_name);
    writer.attribute("/job", "version", job.version);
    writer.attribute(
        "/job", "libraries", job.libraries.empty() ? library_versions() : job.libraries);
    writer.attribute("/job", "seed", static_cast<std::int64_t>(job.seed));
    writer.attribute("/job", "started", job.started);
    writer.attribute("/job", "ended", job.ended);
    writer.dataset("/job/text", {"the job file, whole", "", "job"}, {job.job_text});
    write_companions(writer, job.companions);
    write_inputs(writer, job.inputs);
    write_options(writer, options);
}

void write_vectors(Writer& writer, const std::vector<VectorParameter>& vectors) {
    std::vector<std::int64_t> first, amplitude_free, direction_free;
    for (const VectorParameter& vector : vectors) {
        first.push_back(vector.first);
        amplitude_free.push_back(vector.amplitude_free ? 1 : 0);
        direction_free.push_back(vector.direction_free ? 1 : 0);
    }
    const std::string place = "/parameters/vectors/";
    const Shape shape{vectors.size()};
    writer.group("/parameters/vectors", "three neighbouring parameters that form a vector");
    writer.dataset(place + "name",
                   {"name of the vector", "", "vector"},
                   column_of(vectors, &VectorParameter::name));
    writer.dataset(place + "first",
                   {"its x component, as a column of the draws, counted from 0; y and z follow",
                    "1",
                    "vector"},
                   shape,
                   all_of(first));
    writer.dataset(place + "amplitude_free",
                   {"1; 0 where the prior fixes the amplitude", "1", "vector"},
                   shape,
                   all_of(amplitude_free));
    writer.dataset(place + "direction_free",
                   {"1; 0 where the prior fixes the direction", "1", "vector"},
                   shape,
                   all_of(direction_free));
}

void write_parameters(Writer& writer, const std::vector<Parameter>& parameters) {
    std::vector<std::string> roles;
    for (const Parameter& parameter : parameters)
        roles.emplace_back(chain_layout::word_for(chain_layout::roles, parameter.role));
    writer.group("/parameters", "the columns of the draws, in order");
    writer.dataset(
        "/parameters/name", {"name", "", "parameter"}, column_of(parameters, &Parameter::name));
    writer.dataset("/parameters/unit",
                   {"unit of the draws", "", "parameter"},
                   column_of(parameters, &Parameter::unit));
    writer.dataset("/parameters/meaning",
                   {"what it is", "", "parameter"},
                   column_of(parameters, &Parameter::meaning));
    writer.dataset("/parameters/role",
                   {"`sampled`; `constant`: fixed by its prior; `redrawn`: integrated out and "
                    "drawn from its exact conditional when a row was stored",
                    "",
                    "parameter"},
                   roles);
}

}  // namespace

void write_head(Writer& writer,
                const Provenance& provenance,
                const std::vector<Parameter>& parameters,
                const std::vector<VectorParameter>& vectors,
                const Counts& counts,
                const EnsembleOptions& options) {
    h5::write_identity(writer, chain_layout::identity());
    write_job(writer, provenance, options);
    write_parameters(writer, parameters);
    write_vectors(writer, vectors);
    write_counts_group(writer, "/counts", counts);
    writer.group("/state",
                 "where the sampler stood at the end of each block: enough to go on from");
    writer.group("/outcome", "how the run ended; numbers are per walker, warm-up included");
    write_end(writer, Outcome::End::not_run);
}

}  // namespace deviascope
