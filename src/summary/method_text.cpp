// SPDX-License-Identifier: GPL-2.0-or-later
#include <fmt/format.h>
#include <fmt/ranges.h>

#include <algorithm>
#include <cmath>

#include "deviascope/core/grouped_number.h"
#include "deviascope/summary/result_tables.h"
#include "summary/counted_words.h"
#include "summary/vector_words.h"

namespace deviascope {
namespace {

/// Digits apart by thin blanks.
std::string number(std::int64_t value) {
    std::string text = grouped(value);
    for (std::size_t at = 0; (at = text.find(' ', at)) != std::string::npos; at += 2)
        text.replace(at, 1, "\\,");
    return text;
}

std::string data_sentence(const Summary& summary, const Chain& chain) {
    return fmt::format(
        "We count ${}$ sources in {} of {} ({}) in HEALPix pixels \\cite{{gorski2005}} of "
        "$N_\\mathrm{{side}} = {}$, in the {} frame.",
        number(total_sources(summary)),
        count_of(summary.bins.size(), "bin", "bins"),
        count_of(summary.survey_names.size(), "survey", "surveys"),
        latex_text(fmt::format("{}", fmt::join(summary.survey_names, ", "))),
        chain.counts.nside,
        summary.frame == Frame::icrs ? "ICRS" : name_of(summary.frame));
}

std::string model_sentences(const Summary& summary) {
    const bool is_shared = summary.intrinsic.size() == 1 && summary.intrinsic[0].name == "all";
    return fmt::format(
        "The count of a bin in a pixel of solid angle $\\Omega$ with exposure $w$ and "
        "direction "
        "$\\mathbf{{n}}$ is taken to be Poisson distributed about $\\Omega M w [\\gamma (1 - "
        "\\boldsymbol{{\\beta}}\\cdot\\mathbf{{n}})]^{{-B}} (1 + r\\,\\mathbf{{D}}\\cdot"
        "\\mathbf{{n}})$ \\cite{{ellis1984}}, with the observer's velocity "
        "$\\boldsymbol{{\\beta}}$ (units of $c$, Lorentz factor $\\gamma$) common to all bins, "
        "the intrinsic dipole $\\mathbf{{D}}$ of {}, the monopole $M$ and kinematic weight $B$ "
        "of the bin, and a factor $r$ of it, 1 unless stated; where a dispersion is stated, "
        "the bin's log-likelihood is divided by it.\n"
        "Table~\\ref{{tab:bins}} gives the priors of the weights; the monopoles have the scale "
        "prior $1/M$ unless stated.",
        is_shared ? "all surveys" : "its survey");
}

std::string prior_sentence(const VectorSummary& vector) {
    return fmt::format("The prior of the {} is {} ({}).",
                       latex_text(name_of(vector)),
                       latex_text(vector.prior),
                       latex_text(vector.prior_description));
}

std::string diagnostic(double value, int decimals) {
    return std::isfinite(value) ? fmt::format("{:.{}f}", value, decimals) : "undefined";
}

/// The kernels that the job gives a share of the proposals.
std::string kernel_words(const EnsembleOptions& options) {
    std::vector<std::string> kernels;
    const KernelFractions& share = options.kernels;
    if (share.stretch > 0.0) kernels.emplace_back("stretch moves \\cite{goodman2010}");
    if (share.differential_evolution > 0.0)
        kernels.emplace_back("differential-evolution moves \\cite{terbraak2006}");
    if (share.independence > 0.0)
        kernels.emplace_back(
            "independence proposals \\cite{tierney1994} from the Laplace approximation");
    const std::string last = kernels.back();
    kernels.pop_back();
    return kernels.empty() ? last : fmt::format("{} and {}", fmt::join(kernels, ", "), last);
}

std::string sampling_sentence(const Summary& summary, const Chain& chain) {
    const SamplingSummary& sampling = summary.sampling;
    const std::string verdict =
        sampling.converged
            ? "The run met its stopping rule"
            : "\\textbf{The run did NOT meet its stopping rule and must not be published}";
    return fmt::format(
        "The posterior was sampled with deviascope {} (seed {}) by {} of {} walkers with {}; "
        "of "
        "${}$ steps a walker the first ${}$ were discarded. {}: the largest rank-normalised "
        "split $\\widehat{{R}}$ \\cite{{vehtari2021}} is {} over walkers and {} over "
        "ensembles, "
        "and the fewest effective draws are ${}$.",
        latex_text(chain.provenance.version),
        chain.provenance.seed,
        sampling.replicates == 1 ? "one ensemble"
                                 : fmt::format("{} independent ensembles", sampling.replicates),
        sampling.walkers,
        kernel_words(chain.options),
        number(sampling.outcome.steps),
        number(sampling.outcome.discarded),
        verdict,
        diagnostic(sampling.walker_rhat_max, 3),
        diagnostic(sampling.replicate_rhat_max, 4),
        number(static_cast<std::int64_t>(
            std::isfinite(sampling.effective_draws_min) ? sampling.effective_draws_min : 0.0)));
}

}  // namespace

std::string separation_sentence(const Summary& summary) {
    const bool none_free = std::ranges::none_of(
        summary.intrinsic, [](const VectorSummary& vector) { return vector.amplitude_free; });
    if (!summary.velocity.amplitude_free)
        return "The velocity is fixed: there is nothing to separate.";
    if (none_free)
        return "No intrinsic dipole is free: all of the dipole counts as motion, apart from "
               "what is fixed.";
    const std::string& verdict = summary.separation.joint.verdict;
    return fmt::format("Velocity and intrinsic dipoles are {}.", verdict);
}

std::string method_text(const Summary& summary, const Chain& chain) {
    std::vector<std::string> sentences{data_sentence(summary, chain), model_sentences(summary)};
    sentences.push_back(prior_sentence(summary.velocity));
    for (const VectorSummary& vector : summary.intrinsic)
        sentences.push_back(prior_sentence(vector));
    sentences.push_back(latex_text(separation_sentence(summary)));
    sentences.push_back(sampling_sentence(summary, chain));
    sentences.push_back(
        "Intervals are the shortest that hold $68.27\\,\\%$ and $95.45\\,\\%$ of the posterior "
        "draws, regions of direction the smallest areas of sky that do. Amplitudes of vectors "
        "carry the volume factor of their prior; Table~\\ref{tab:results} gives the median "
        "under each prior alone.");
    return "% Needs \\usepackage{amsmath}.\n" + fmt::format("{}\n", fmt::join(sentences, "\n"));
}

std::string references_bib() {
    return R"(@article{ellis1984, author = {Ellis, G. F. R. and Baldwin, J. E.},
  title = {On the expected anisotropy of radio source counts},
  journal = {Monthly Notices of the Royal Astronomical Society}, volume = {206}, pages = {377--381}, year = {1984}}
@article{gorski2005, author = {G{\'o}rski, K. M. and Hivon, E. and Banday, A. J. and Wandelt, B. D. and Hansen, F. K. and Reinecke, M. and Bartelmann, M.},
  title = {{HEALPix}: A Framework for High-Resolution Discretization and Fast Analysis of Data Distributed on the Sphere},
  journal = {The Astrophysical Journal}, volume = {622}, pages = {759--771}, year = {2005}}
@article{goodman2010, author = {Goodman, J. and Weare, J.},
  title = {Ensemble samplers with affine invariance},
  journal = {Communications in Applied Mathematics and Computational Science}, volume = {5}, pages = {65--80}, year = {2010}}
@article{terbraak2006, author = {ter Braak, C. J. F.},
  title = {A {Markov Chain Monte Carlo} version of the genetic algorithm {Differential Evolution}: easy {Bayesian} computing for real parameter spaces},
  journal = {Statistics and Computing}, volume = {16}, pages = {239--249}, year = {2006}}
@article{tierney1994, author = {Tierney, L.},
  title = {{Markov} Chains for Exploring Posterior Distributions},
  journal = {The Annals of Statistics}, volume = {22}, pages = {1701--1728}, year = {1994}}
@article{vehtari2021, author = {Vehtari, A. and Gelman, A. and Simpson, D. and Carpenter, B. and B{\"u}rkner, P.-C.},
  title = {Rank-Normalization, Folding, and Localization: An Improved $\widehat{R}$ for Assessing Convergence of {MCMC} (with Discussion)},
  journal = {Bayesian Analysis}, volume = {16}, pages = {667--718}, year = {2021}}
)";
}

}  // namespace deviascope
