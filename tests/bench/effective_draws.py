# SPDX-License-Identifier: GPL-2.0-or-later
"""Effective draws of a chain file by the definition in DEVELOPERS.md, "Warm-up, looks and the end",
written from Vehtari et al. 2021 (Bayesian Analysis 16, 667) with NumPy and SciPy; shares no code
with the program.

    /usr/bin/python3 tests/bench/effective_draws.py chains.h5
"""
import sys

import h5py
import numpy
from scipy.stats import norm, rankdata


def split(chains):
    half = len(chains) // 2
    return numpy.concatenate([chains[:half], chains[len(chains) - half:]], axis=1)


def effective(chains):
    """Of split chains (draws x chains): Geyer's initial monotone sequence of averaged correlations."""
    n, m = chains.shape
    centred = chains - chains.mean(axis=0)
    size = 2 ** int(numpy.ceil(numpy.log2(2 * n)))
    power = abs(numpy.fft.rfft(centred, size, axis=0)) ** 2
    covariance = numpy.fft.irfft(power, axis=0)[:n] / n
    within = covariance[0].mean() * n / (n - 1)
    total = covariance[0].mean() + (chains.mean(axis=0).var(ddof=1) if m > 1 else 0.0)
    rho = 1 - (within - covariance.mean(axis=1)) / total
    rho[0] = 1
    pairs, smallest = 0.0, numpy.inf
    for k in range(0, n - 1, 2):
        pair = rho[k] + rho[k + 1]
        if pair <= 0:
            break
        smallest = min(smallest, pair)
        pairs += smallest
    return n * m / max(2 * pairs - 1, 1 / numpy.log10(n * m))


def smaller_of_bulk_and_tail(chains):
    chains = split(chains)
    rank = rankdata(chains).reshape(chains.shape)
    bulk = effective(norm.ppf((rank - 0.375) / (chains.size + 0.25)))
    low, high = numpy.quantile(chains, [0.05, 0.95])
    return min(bulk, *(effective((chains <= q).astype(float)) for q in (low, high)))


with h5py.File(sys.argv[1], "r") as file:
    names = [name.decode() if isinstance(name, bytes) else name for name in file["parameters/name"][()]]
    draws = file["draws"][()]
rows, replicates, walkers, _ = draws.shape
seen = min(walkers, 32)
series = {name: draws[:, :, :seen, k].reshape(rows, -1) for k, name in enumerate(names)
          if not name.startswith("monopole.") and numpy.ptp(draws[..., k]) > 0}
for x in [name for name in series if name.endswith(".x")]:
    stem = x[:-2]
    vector = numpy.stack([series[f"{stem}.{axis}"] for axis in "xyz"])
    length = numpy.sqrt((vector**2).sum(axis=0))
    series[f"{stem}.amplitude"] = length
    for axis, component in zip("xyz", vector / length):
        series[f"{stem}.direction.{axis}"] = component
found = {name: smaller_of_bulk_and_tail(chains) * walkers / seen for name, chains in series.items()}
worst = min(found, key=found.get)
print(f"{found[worst]:.1f} effective draws of {worst}, the worst of {len(found)} scalars")
