# SPDX-License-Identifier: GPL-2.0-or-later
"""The log posterior of three invented surveys with 24 bins, as a plain NumPy script.

Formula, data and priors: README.md of this folder. Nothing of deviascope is used.
Run with --values to write values.csv, with --time to print CPU seconds per evaluation.
"""
import os
import sys
import time

os.environ.setdefault("OMP_NUM_THREADS", "1")
os.environ.setdefault("OPENBLAS_NUM_THREADS", "1")
import healpy
import numpy as np

NSIDE, SURVEYS, BINS = 64, 3, 8


def exposure(survey, n):
    """Exposure of pixel centres n (n_pixels x 3); 0: not kept."""
    if survey == 0:
        return np.where(np.abs(n[:, 2]) > 0.26, 1.0, 0.0)
    if survey == 1:
        return np.where(n[:, 2] > -0.6, 1.0 - 0.25 * n[:, 0] ** 2, 0.0)
    return np.ones(len(n))


def weight_mean(survey, b):
    return 2.0 + 0.75 * b + 0.25 * survey


class Survey:
    def __init__(self, s, centres):
        keep = exposure(s, centres) > 0.0
        self.n = centres[keep]
        self.w = exposure(s, self.n)
        pixel = np.flatnonzero(keep)
        self.counts = []
        for b in range(BINS):
            a, d = 6.0 + 2.0 * b + s, 0.003 * (b + 1)
            slope = 1.0 + d * self.n[:, 0] - 0.5 * d * self.n[:, 1] + 0.01 * self.n[:, 2]
            made = np.floor(a * slope) + ((2 * s + 3) * pixel + 5 * b) % (7 + b)
            self.counts.append(made * np.round(self.w + 0.2))
        self.totals = [c.sum() for c in self.counts]


def make_surveys():
    centres = np.array(healpy.pix2vec(NSIDE, np.arange(12 * NSIDE**2))).T
    return [Survey(s, centres) for s in range(SURVEYS)]


def log_prior(theta):
    beta, dipoles, weights = theta[:3], theta[3:12], theta[12:]
    if beta @ beta >= 0.05**2:
        return -np.inf
    mean = np.array([weight_mean(s, b) for s in range(SURVEYS) for b in range(BINS)])
    total = -np.log(4.0 / 3.0 * np.pi * 0.05**3)
    total += -0.5 * np.sum((dipoles / 0.02) ** 2) - 9 * np.log(0.02 * np.sqrt(2 * np.pi))
    total += -0.5 * np.sum(((weights - mean) / 0.1) ** 2) - 24 * np.log(0.1 * np.sqrt(2 * np.pi))
    return total


def log_posterior(theta, surveys):
    """Monopoles under 1/M integrated out, relative to the isotropic sky."""
    total = log_prior(theta)
    beta = theta[:3]
    log_gamma = -0.5 * np.log1p(-beta @ beta)
    for s, survey in enumerate(surveys):
        kinematic = log_gamma + np.log1p(-(survey.n @ beta))
        intrinsic = np.log1p(survey.n @ theta[3 + 3 * s:6 + 3 * s])
        sky = survey.w.sum()
        for b in range(BINS):
            y = intrinsic - theta[12 + BINS * s + b] * kinematic
            excess = survey.w @ np.expm1(y) / sky
            total += survey.counts[b] @ y - survey.totals[b] * np.log1p(excess)
    return total


def points():
    """Sixteen points, from dipoles of 0 to beyond the usual."""
    made = []
    for k in range(16):
        theta = np.sin(0.7 + 1.3 * k + 2.1 * np.arange(36))
        theta[:3] *= 0.028 * k / 15
        theta[3:12] *= 0.05 * k / 15
        theta[12:] *= 0.2
        theta[12:] += [weight_mean(s, b) for s in range(SURVEYS) for b in range(BINS)]
        made.append(theta)
    return made


if __name__ == "__main__":
    surveys = make_surveys()
    if "--values" in sys.argv:
        with open(os.path.join(os.path.dirname(os.path.abspath(__file__)), "values.csv"), "w") as out:
            out.write("# sources of each survey: " +
                      " ".join(str(int(sum(s.totals))) for s in surveys) + "\n")
            for theta in points():
                value = log_posterior(theta, surveys)
                out.write(",".join(repr(float(x)) for x in [*theta, value]) + "\n")
    if "--time" in sys.argv:
        taken = []
        for theta in points():
            begin = time.process_time()
            log_posterior(theta, surveys)
            taken.append(time.process_time() - begin)
        print(np.median(taken))
