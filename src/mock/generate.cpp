// SPDX-License-Identifier: GPL-2.0-or-later
#include "deviascope/mock/generate.h"

#include <fmt/format.h>

#include <Eigen/Geometry>
#include <algorithm>
#include <boost/random/poisson_distribution.hpp>
#include <cmath>
#include <memory>
#include <numbers>

#include "deviascope/core/error.h"
#include "deviascope/core/parallel.h"
#include "deviascope/core/random.h"
#include "deviascope/sky/boost.h"
#include "deviascope/mock/exposure.h"

namespace deviascope {

namespace {

/// Sources drawn at a time; part of no result, only of memory and speed.
constexpr std::int64_t chunk_size = 1 << 14;

constexpr std::size_t at(Property property) {
    return static_cast<std::size_t>(property);
}

/// Uniform in (0, 1]: a fraction whose logarithm is finite.
double fraction(Stream& stream) {
    return 1.0 - uniform(stream);
}

std::int64_t poisson(Stream& stream, double mean) {
    return boost::random::poisson_distribution<std::int64_t, double>(mean)(stream);
}

/// A unit vector along `vector` and two more that make a right-handed frame with it.
Eigen::Matrix3d frame_about(const Eigen::Vector3d& vector) {
    if (vector.isZero(0.0)) return Eigen::Matrix3d::Identity();
    const Direction pole = vector.normalized();
    const Direction across = pole.unitOrthogonal();
    Eigen::Matrix3d axes;
    axes << across, pole.cross(across), pole;
    return axes;
}

/// One survey of a scenario, made ready to draw any of its sources.
class SurveySky {
  public:
    SurveySky(const Scenario& scenario, std::size_t number);

    std::int64_t n_sources() const;
    /// Draws sources [first, last) and appends what is kept of them.
    void draw(std::int64_t first, std::int64_t last, MockRows& rows, MockTally& tally) const;

  private:
    Direction draw_position(Stream& stream) const;
    PropertyValues draw_properties(Stream& stream) const;
    void boost(PropertyValues& values, double delta) const;
    void measure(Stream& stream, PropertyValues& values) const;
    bool in_kept_ranges(const PropertyValues& values) const;
    bool excluded(const Direction& position, MockTally& tally) const;
    void append(std::int64_t times,
                const Direction& position,
                const PropertyValues& values,
                MockRows& rows) const;
    void draw_source(std::int64_t source, MockRows& rows, MockTally& tally) const;

    const MockSurvey& survey_;
    std::uint64_t seed_;
    std::uint64_t number_;
    double dipole_;
    Eigen::Matrix3d dipole_axes_;
    Boost boost_;
    Eigen::Matrix3d to_catalogue_;
    std::vector<ExclusionTest> exclusions_;
    std::unique_ptr<ExposureLookup> exposure_;
};

SurveySky::SurveySky(const Scenario& scenario, std::size_t number)
    : survey_(scenario.surveys[number]),
      seed_(scenario.seed),
      number_(number),
      dipole_(survey_.intrinsic.norm()),
      dipole_axes_(frame_about(survey_.intrinsic)),
      boost_(scenario.velocity),
      to_catalogue_(rotation(scenario.frame, survey_.output.frame)) {
    for (const Exclusion& exclusion : survey_.exclude)
        exclusions_.emplace_back(exclusion, survey_.output.frame);
    if (survey_.exposure)
        exposure_ = std::make_unique<ExposureLookup>(exposure_map(*survey_.exposure),
                                                     survey_.output.frame);
}

std::int64_t SurveySky::n_sources() const {
    Stream stream(seed_, Purpose::mock_population, 0, number_, 0);
    return poisson(stream, survey_.sources);
}

Direction SurveySky::draw_position(Stream& stream) const {
    const double mu = polar_cosine_of(dipole_, uniform(stream));
    const double azimuth = 2.0 * std::numbers::pi * uniform(stream);
    const double sine = std::sqrt((1.0 - mu) * (1.0 + mu));
    return dipole_axes_ * Direction(sine * std::cos(azimuth), sine * std::sin(azimuth), mu);
}

PropertyValues SurveySky::draw_properties(Stream& stream) const {
    PropertyValues values{};
    const SpectralIndexDistribution& alpha = survey_.alpha;
    values[at(Property::alpha)] = alpha.mean;
    if (alpha.sd > 0.0) values[at(Property::alpha)] += alpha.sd * normal(stream);
    if (survey_.flux) values[at(Property::flux)] = flux_of(*survey_.flux, fraction(stream));
    if (survey_.redshift) {
        const double first = fraction(stream);
        const double second = fraction(stream);
        values[at(Property::redshift)] = redshift_of(*survey_.redshift, first, second);
    }
    if (survey_.magnitude)
        values[at(Property::magnitude)] = magnitude_of(*survey_.magnitude, fraction(stream));
    if (survey_.size) values[at(Property::size)] = size_of(*survey_.size, normal(stream));
    return values;
}

void SurveySky::boost(PropertyValues& values, double delta) const {
    const double alpha = values[at(Property::alpha)];
    double& flux = values[at(Property::flux)];
    double& redshift = values[at(Property::redshift)];
    double& magnitude = values[at(Property::magnitude)];
    double& size = values[at(Property::size)];
    if (survey_.flux) flux = boosted_flux(flux, alpha, delta);
    if (survey_.redshift) redshift = boosted_redshift(redshift, delta);
    if (survey_.magnitude) magnitude = boosted_magnitude(magnitude, alpha, delta);
    if (survey_.size) size = boosted_size(size, delta);
}

void SurveySky::measure(Stream& stream, PropertyValues& values) const {
    const MeasurementScatter& scatter = survey_.scatter;
    double& flux = values[at(Property::flux)];
    double& redshift = values[at(Property::redshift)];
    double& magnitude = values[at(Property::magnitude)];
    double& size = values[at(Property::size)];
    if (scatter.flux > 0.0) flux *= 1.0 + scatter.flux * normal(stream);
    if (scatter.redshift > 0.0)
        redshift += scatter.redshift * (1.0 + redshift) * normal(stream);
    if (scatter.magnitude > 0.0) magnitude += scatter.magnitude * normal(stream);
    if (scatter.size > 0.0) size *= 1.0 + scatter.size * normal(stream);
    // Cuts must see what a reader of the catalogue will see.
    if (survey_.output.single_precision)
        for (double& value : values) value = static_cast<double>(static_cast<float>(value));
}

bool SurveySky::in_kept_ranges(const PropertyValues& values) const {
    return std::all_of(survey_.keep.begin(), survey_.keep.end(), [&](const KeptRange& range) {
        const double value = values[at(range.property)];
        return value >= range.low && value < range.high;
    });
}

bool SurveySky::excluded(const Direction& position, MockTally& tally) const {
    for (std::size_t number = 0; number < exclusions_.size(); ++number) {
        if (!exclusions_[number].excludes(position)) continue;
        ++tally.excluded[number];
        return true;
    }
    return false;
}

void SurveySky::append(std::int64_t times,
                       const Direction& position,
                       const PropertyValues& values,
                       MockRows& rows) const {
    const auto n = static_cast<std::size_t>(times);
    rows.position.insert(rows.position.end(), n, position);
    for (std::size_t which = 0; which < n_properties; ++which)
        if (survey_.has(static_cast<Property>(which)))
            rows.property[which].insert(rows.property[which].end(), n, values[which]);
}

void SurveySky::draw_source(std::int64_t source, MockRows& rows, MockTally& tally) const {
    Stream stream(seed_, Purpose::mock_source, static_cast<std::uint64_t>(source), number_, 0);
    const Direction at_rest = draw_position(stream);
    PropertyValues values = draw_properties(stream);
    boost(values, boost_.doppler_factor(at_rest));
    measure(stream, values);
    ++tally.drawn;
    if (!in_kept_ranges(values)) {
        ++tally.outside_kept_range;
        return;
    }
    const Direction position = to_catalogue_ * boost_.aberrated(at_rest);
    if (excluded(position, tally)) return;
    if (exposure_ && uniform(stream) >= exposure_->at(position)) {
        ++tally.thinned;
        return;
    }
    const double extra = survey_.extra_components;
    const std::int64_t n_rows = 1 + (extra > 0.0 ? poisson(stream, extra) : 0);
    ++tally.kept;
    tally.rows += n_rows;
    append(n_rows, position, values, rows);
}

void SurveySky::draw(std::int64_t first,
                     std::int64_t last,
                     MockRows& rows,
                     MockTally& tally) const {
    tally.excluded.assign(exclusions_.size(), 0);
    for (std::int64_t source = first; source < last; ++source) draw_source(source, rows, tally);
}

/// A piece of the survey: what one thread draws at a time.
struct Piece {
    MockRows rows;
    MockTally tally;
};

/// As many pieces as are drawn before their rows are handed on: a few a thread, so that none
/// waits long and little is held in memory.
std::vector<Piece> pieces_for(int threads) {
    return std::vector<Piece>(threads > 1 ? 4 * static_cast<std::size_t>(threads) : 1);
}

/// Draws the sources from `first` on that fill all pieces, or what is left of n_sources.
void draw_pieces(const SurveySky& sky,
                 std::int64_t first,
                 std::int64_t n_sources,
                 int threads,
                 std::vector<Piece>& pieces) {
    parallel_for(pieces.size(), threads, [&](std::size_t index) {
        Piece& piece = pieces[index];
        const std::int64_t from =
            std::min(n_sources, first + static_cast<std::int64_t>(index) * chunk_size);
        piece.rows.clear();
        piece.tally = {};
        sky.draw(from, std::min(n_sources, from + chunk_size), piece.rows, piece.tally);
    });
}

}  // namespace

void MockRows::clear() {
    position.clear();
    for (std::vector<double>& values : property) values.clear();
}

void MockTally::add(const MockTally& other) {
    drawn += other.drawn;
    outside_kept_range += other.outside_kept_range;
    excluded.resize(std::max(excluded.size(), other.excluded.size()), 0);
    for (std::size_t number = 0; number < other.excluded.size(); ++number)
        excluded[number] += other.excluded[number];
    thinned += other.thinned;
    kept += other.kept;
    rows += other.rows;
    finished = finished && other.finished;
}

MockTally draw_survey(const Scenario& scenario,
                      std::size_t survey,
                      const MockOptions& options,
                      const MockSink& sink) {
    ensure(survey < scenario.surveys.size(), "the survey is one of the scenario");
    if (std::vector<Message> problems = scenario.problems(); !problems.empty())
        throw UsageError(std::move(problems));
    const SurveySky sky(scenario, survey);
    const std::int64_t n_sources = sky.n_sources();
    const std::string& name = scenario.surveys[survey].name;
    std::vector<Piece> pieces = pieces_for(options.threads);
    MockTally total;
    total.excluded.assign(scenario.surveys[survey].exclude.size(), 0);
    while (total.drawn < n_sources) {
        if (options.stop_requested && options.stop_requested()) {
            total.finished = false;
            break;
        }
        draw_pieces(sky, total.drawn, n_sources, options.threads, pieces);
        for (const Piece& piece : pieces) {
            total.add(piece.tally);
            if (piece.rows.size() > 0) sink(piece.rows);
        }
        if (options.progress)
            options.progress(
                fmt::format("{}: {} of {} sources drawn", name, total.drawn, n_sources));
    }
    return total;
}

MockRows draw_survey_rows(const Scenario& scenario, std::size_t survey, int threads) {
    MockRows all;
    MockOptions options;
    options.threads = threads;
    draw_survey(scenario, survey, options, [&](const MockRows& rows) {
        all.position.insert(all.position.end(), rows.position.begin(), rows.position.end());
        for (std::size_t which = 0; which < n_properties; ++which)
            all.property[which].insert(all.property[which].end(),
                                       rows.property[which].begin(),
                                       rows.property[which].end());
    });
    return all;
}

}  // namespace deviascope
