// SPDX-License-Identifier: GPL-2.0-or-later
// Weights measured from catalogue files: what is refused, warned of and reported.
#include "deviascope/weights/measure_weights.h"

#include <fmt/format.h>
#include <fmt/ranges.h>

#include <catch2/catch.hpp>
#include <cmath>
#include <functional>

#include "../counts/small_survey.h"
#include "deviascope/core/random.h"
#include "weights/box.h"

using namespace deviascope;
using test::infinity;
using test::SmallSurvey;

namespace {

/// A row of the catalogue; NaN alpha is written as a blank.
struct Source {
    double lon, lat, flux, alpha;
};

/// A survey whose sources follow N(>S) = (S / 0.8)^-1.1 all over the sky.
struct PowerLawSurvey : SmallSurvey {
    SourcePhysics physics;
    std::size_t n_written = 0;

    explicit PowerLawSurvey(double alpha = 0.75) {
        input.columns = {{"lon", "RA"}, {"lat", "DEC"}, {"flux", "S"}};
        physics.alpha = SpectralIndex{alpha, 0.0};
    }
    /// @param change  alters a source; false leaves it out
    void draw(std::size_t n, const std::function<bool(Source&, Stream&)>& change = {}) {
        std::string rows = "RA,DEC,S,A\n";
        for (std::size_t i = 0; i < n; ++i) {
            Stream stream(52020, Purpose::test, i, 0, 0);
            Source source{};
            source.lon = 360.0 * uniform(stream);
            source.lat = std::asin(2.0 * uniform(stream) - 1.0) * 57.29577951308232;
            source.flux = 0.8 * std::pow(1.0 - uniform(stream), -1.0 / 1.1);
            source.alpha = 0.75;
            if (change && !change(source, stream)) continue;
            ++n_written;
            rows += fmt::format("{:.6f},{:.6f},{:.9g},", source.lon, source.lat, source.flux);
            rows += std::isnan(source.alpha) ? "\n" : fmt::format("{:.9g}\n", source.alpha);
        }
        input.catalogue = {folder.write("a.csv", rows)};
    }
    MeasuredWeights measure(WeighOptions options = {}) const {
        std::vector<std::size_t> bins;
        for (std::size_t b = 0; b < input.bins.size(); ++b) bins.push_back(b);
        options.seed = 52021;
        return measure_weights(input, physics, bins, Pixelisation(4), Frame::icrs, options);
    }
    std::string refusal() const {
        try {
            measure();
        } catch (const Error& error) {
            return error.what();
        }
        return "accepted";
    }
};

}  // namespace

TEST_CASE("weights of a power law are measured from a file", "[weights]") {
    PowerLawSurvey survey;
    survey.add_bin("faint", {{"flux", 2.0, 5.0}});
    survey.add_bin("bright", {{"flux", 5.0, infinity}});
    survey.input.exclude = {{BandExclusion{20.0}, Frame::icrs}};
    survey.draw(60'000);
    const MeasuredWeights found = survey.measure();
    CHECK(found.survey == "dunlin");
    CHECK(found.replicates == 200);
    CHECK(found.warnings.empty());
    const SurveyCounts counts = survey.count(4);
    for (std::size_t b = 0; b < 2; ++b) {
        const BinReport& bin = found.bins[b];
        INFO(bin.name << ": " << bin.mean << " +- " << bin.sd);
        CHECK(bin.sources == counts.bins[b].total());  // judged by the same cuts
        CHECK(std::abs(bin.mean - (2.0 + 1.1 * 1.75)) < 4.0 * bin.sd);
        const auto i = static_cast<Eigen::Index>(b);
        CHECK(bin.sd == std::sqrt(found.covariance(i, i)));
    }
    REQUIRE(found.bins[0].edges.size() == 2);
    const EdgeReport& edge = found.bins[0].edges[0];
    CHECK(edge.property == "flux");
    CHECK(edge.value == 2.0);
    CHECK(edge.method == EdgeMethod::central);
    CHECK(found.bins[0].mean ==
          Approx(2.0 + edge.term + found.bins[0].edges[1].term).epsilon(1e-14));
    // The edge at 5 adds to one bin what it takes from the other: their errors are shared.
    CHECK(found.covariance(0, 1) < 0.0);
    CHECK(found.bins[0].edges[1].term * static_cast<double>(found.bins[0].sources) ==
          Approx(-found.bins[1].edges[0].term * static_cast<double>(found.bins[1].sources)));
}

TEST_CASE("the spectral index of the sources at the edge counts", "[weights]") {
    PowerLawSurvey survey;
    survey.physics.alpha.reset();
    survey.input.columns["alpha"] = "A";
    survey.add_bin("all", {{"flux", 2.0, infinity}});
    survey.draw(60'000, [](Source& s, Stream& stream) {
        s.alpha = 0.5 + 0.3 * std::log(s.flux) + 0.2 * normal(stream);
        return true;
    });
    const MeasuredWeights found = survey.measure();
    const double expected = 2.0 + 1.1 * (1.5 + 0.3 * std::log(2.0));
    INFO(found.bins[0].mean << " +- " << found.bins[0].sd);
    CHECK(std::abs(found.bins[0].mean - expected) < 4.0 * found.bins[0].sd);
    CHECK(std::abs(found.bins[0].mean - (2.0 + 1.1 * 1.5)) > 4.0 * found.bins[0].sd);
}

TEST_CASE("the scatter of a mean spectral index is in the error, not in the weight",
          "[weights]") {
    PowerLawSurvey survey;
    survey.add_bin("all", {{"flux", 2.0, infinity}});
    survey.draw(30'000);
    const BinReport without = survey.measure().bins[0];
    survey.physics.alpha->sd = 1.5;
    const BinReport with = survey.measure().bins[0];
    CHECK(with.mean == without.mean);
    // var of a sum of 1 + alpha_i: (1 + mean)^2 + sd^2 a source, of which N takes off some.
    CHECK(with.sd > 1.2 * without.sd);
    CHECK(with.sd < 1.7 * without.sd);
}

TEST_CASE("a neighbour that is exposed less counts for more", "[weights]") {
    // One in four sources of the bright bin is found, as its exposure says.
    PowerLawSurvey survey;
    survey.add_bin("faint", {{"flux", 2.0, 4.0}});
    survey.add_bin("bright", {{"flux", 4.0, infinity}});
    survey.draw(120'000, [](Source& s, Stream& stream) {
        return s.flux < 4.0 || uniform(stream) < 0.25;
    });
    survey.input.bins[1].exposure =
        survey.add_map("bright.fits", std::vector<double>(12, 0.25));
    const MeasuredWeights found = survey.measure();
    for (const BinReport& bin : found.bins) {
        INFO(bin.name << ": " << bin.mean << " +- " << bin.sd);
        CHECK(std::abs(bin.mean - 3.925) < 4.0 * bin.sd);
        CHECK(bin.edges[0].method == EdgeMethod::central);
    }
    CHECK(found.warnings.empty());
    survey.input.bins[1].exposure.reset();
    CHECK_FALSE(survey.measure().warnings.empty());  // a step at the edge, and no reason for it
}

TEST_CASE("a catalogue that ends at an edge is fitted from inside, strays or not",
          "[weights]") {
    PowerLawSurvey survey;
    survey.add_bin("all", {{"flux", 1.0, infinity}});
    survey.draw(80'000, [](Source& s, Stream& stream) {
        return s.flux > 1.0 || uniform(stream) < 0.02;
    });
    const MeasuredWeights found = survey.measure();
    CHECK(found.bins[0].edges[0].method == EdgeMethod::one_sided);
    CHECK(found.bins[0].edges[0].outside == 0.0);
    CHECK(std::abs(found.bins[0].mean - 3.925) < 4.0 * found.bins[0].sd);
    REQUIRE(found.warnings.size() == 1);
    CHECK(
        found.warnings[0] ==
        "bin all: far fewer sources lie beyond its edge flux 1 than inside it lets expect; the "
        "catalogue is taken to end there");
}

TEST_CASE("nothing crosses a flux of zero, an infinite end or a property without physics",
          "[weights]") {
    PowerLawSurvey survey;
    survey.physics.alpha.reset();
    survey.add_bin("all", {{"flux", 0.0, infinity}});
    survey.draw(3'000);
    const MeasuredWeights found = survey.measure();
    CHECK(found.bins[0].mean == 2.0);
    CHECK(found.bins[0].sd == 0.0);
    CHECK(found.bins[0].edges.empty());
}

TEST_CASE("what cannot be measured is refused with its reason", "[weights]") {
    PowerLawSurvey survey;
    SECTION("a catalogue that is too small") {
        survey.add_bin("bright", {{"flux", 2.0, infinity}});
        int n = 0;
        survey.draw(1'500, [&n](Source& s, Stream&) {
            n += s.flux >= 2.0 ? 1 : 0;
            return true;
        });
        CHECK(
            survey.refusal() ==
            fmt::format(
                "survey dunlin, bin bright: {} sources, too few to measure its weight from; at "
                "least 1 000 are needed; give the bin its weight, or make it wider",
                n));
    }
    SECTION("an edge without sources") {
        survey.add_bin("all", {{"flux", 0.05, infinity}});
        survey.draw(3'000);
        CHECK(survey.refusal() ==
              "survey dunlin, bin all: next to no sources near its edge flux 0.05; an edge has "
              "sources near it, on one side at least; write -inf where the bin is open, or "
              "correct the edge");
    }
    SECTION("no spectral index") {
        survey.physics.alpha.reset();
        survey.add_bin("all", {{"flux", 2.0, infinity}});
        survey.draw(3'000);
        CHECK(
            survey.refusal() ==
            "survey dunlin: weights are to be measured at edges of flux or magnitude, and "
            "there is no spectral index; a column alpha, or alpha = { mean = …, sd = … }; add "
            "one of them (alpha = 1 for bolometric fluxes and magnitudes)");
    }
    SECTION("a spectral index that is missing") {
        survey.physics.alpha.reset();
        survey.input.columns["alpha"] = "A";
        survey.add_bin("all", {{"flux", 2.0, infinity}});
        std::vector<std::string> places;
        int row = 0;
        survey.draw(20'000, [&](Source& s, Stream&) {
            ++row;
            if (s.flux < 2.0 || s.flux > 2.001) return true;
            s.alpha = std::nan("");
            places.push_back(fmt::format("a.csv line {}", row + 1));  // after the header
            return true;
        });
        REQUIRE(places.size() > 1);
        REQUIRE(places.size() <= 5);
        CHECK(survey.refusal() ==
              fmt::format(
                  "survey dunlin: {} sources have no spectral index alpha at the edges of "
                  "bins: {}; a number for each source near an edge of flux or magnitude; "
                  "give the survey alpha = {{ mean = …, sd = … }} for those without",
                  places.size(),
                  fmt::join(places, ", ")));
        survey.physics.alpha = SpectralIndex{0.75, 0.1};
        REQUIRE(survey.refusal() == "accepted");
        CHECK(survey.measure().warnings ==
              std::vector<std::string>{fmt::format("{} sources have no spectral index; the "
                                                   "survey's mean and scatter stand in",
                                                   places.size())});
    }
    SECTION("a weight that is unconstrained") {
        // Hardly a source of the bin lies near its edge, and each of them counts for much.
        survey.physics.alpha = SpectralIndex{30.0, 0.0};
        survey.add_bin("all", {{"flux", 2.0, infinity}});
        survey.draw(4'000);
        CHECK(survey.refusal().find("survey dunlin, bin all: its weight is unconstrained: ") ==
              0);
        CHECK(survey.refusal().find("; a standard deviation of 1 or less; give the bin its "
                                    "weight, or make it wider") != std::string::npos);
    }
    SECTION("an edge at a negative flux") {
        survey.add_bin("all", {{"flux", -1.0, infinity}});
        survey.draw(10);
        CHECK(survey.refusal() ==
              "survey dunlin, bin all: an edge at flux -1; edges at positive fluxes and sizes "
              "and at redshifts above -1 have a weight that can be measured; use -inf for a "
              "side that is open, or give the bin its weight");
    }
    SECTION("ranges that exclude each other") {
        survey.input.select = {{"flux", 5.0, infinity}};
        survey.add_bin("all", {{"flux", 1.0, 2.0}});
        survey.draw(10);
        CHECK(survey.refusal() ==
              "survey dunlin, bin all: its flux and the survey's leave nothing: [5, 2); ranges "
              "of the bin and of the survey that overlap; correct one of the two");
    }
}

TEST_CASE("a limit that no select names is warned of", "[weights]") {
    PowerLawSurvey survey;
    survey.input.columns["redshift"] = "A";  // any numbers serve
    survey.add_bin("near", {{"redshift", -infinity, 0.75}});
    survey.draw(20'000, [](Source& s, Stream& stream) {
        s.alpha = 0.75 + 0.1 * normal(stream);
        return true;
    });
    const auto warnings = survey.measure().warnings;
    REQUIRE(warnings.size() == 1);
    CHECK(warnings[0].find("no select names a flux or magnitude") == 0);
}

TEST_CASE("boxes narrow the survey's ranges by the bin's", "[weights]") {
    SurveyInput survey;
    survey.name = "dunlin";
    survey.select = {{"flux", 1.0, 10.0}};
    survey.bins.resize(1);
    survey.bins[0].select = {
        {"redshift", 0.5, infinity}, {"flux", -infinity, 4.0}, {"colour", 0, 1}};
    const Boxes boxes(survey, {0});
    REQUIRE(boxes.dimension.size() == 3);
    REQUIRE(boxes.box[0].sides.size() == 3);
    CHECK(boxes.box[0].sides[0].low == 1.0);
    CHECK(boxes.box[0].sides[0].high == 4.0);
    REQUIRE(boxes.edge.size() == 3);  // flux 1, flux 4, redshift 0.5; nothing moves a colour
    CHECK(boxes.edge[2].centre == Approx(std::log(1.5)).epsilon(1e-15));
    CHECK(boxes.need_spectral_index());
}
