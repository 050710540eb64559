# SPDX-License-Identifier: GPL-2.0-or-later
"""The benchmarks' reference problem as a job: count maps of three invented surveys in 24 bins, with
exposure maps, drawn with NumPy from the model of the README.

    /usr/bin/python3 tests/bench/reference_job.py FOLDER [NSIDE [SOURCES [EFFECTIVE_DRAWS]]]
    time deviascope run FOLDER/reference.toml -o FOLDER/results
    /usr/bin/python3 tests/bench/effective_draws.py FOLDER/results/chains.h5
"""
import pathlib
import sys

import healpy
import numpy

folder = pathlib.Path(sys.argv[1])
nside = int(sys.argv[2]) if len(sys.argv) > 2 else 64
sources = float(sys.argv[3]) if len(sys.argv) > 3 else 1e7
effective_draws = int(float(sys.argv[4])) if len(sys.argv) > 4 else 10000
folder.mkdir(parents=True, exist_ok=True)

n = numpy.array(healpy.pix2vec(nside, numpy.arange(12 * nside**2)))
velocity = numpy.array([0.0012, -0.0015, 0.001])
dipoles = [(0.008, -0.004, 0.003), (-0.002, 0.006, 0.004), (0.001, 0.001, -0.009)]
exposures = [1.0 * (abs(n[2]) > 0.26), (n[2] > -0.6) * (1 - 0.25 * n[0] ** 2), numpy.ones(n.shape[1])]
random = numpy.random.default_rng(20261201)

job = f"""[job]
seed = 1
nside = {nside}
[velocity]
prior = {{ kind = "uniform-vector", max = 0.05 }}
[intrinsic]
prior = {{ kind = "gaussian", sd = 0.02 }}
[ensemble]
effective_draws = {effective_draws}
"""
for survey, (dipole, exposure) in enumerate(zip(dipoles, exposures)):
    name = f"survey-{'abc'[survey]}"
    healpy.write_map(str(folder / f"{name}-exposure.fits"), exposure, coord="G", overwrite=True, dtype=float)
    job += f'[[survey]]\nname = "{name}"\nexposure = "{name}-exposure.fits"\n'
    for number in range(8):
        weight = 2 + 0.75 * number + 0.25 * survey
        mean = exposure * (1 - velocity @ n) ** -weight * (1 + numpy.array(dipole) @ n)
        count = random.poisson(mean * sources / 24 / mean.sum())
        file = f"{name}-{number}.fits"
        healpy.write_map(str(folder / file), count, coord="G", overwrite=True, dtype=numpy.int32)
        job += (f'[[survey.bin]]\nname = "bin-{number}"\ncounts = "{file}"\n'
                f"weight = {{ mean = {weight}, sd = 0.1 }}\n")
(folder / "reference.toml").write_text(job)
