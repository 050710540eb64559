# SPDX-License-Identifier: GPL-2.0-or-later
"""A catalogue of an invented survey with 24 boxes in flux and redshift, to time the measuring of weights.

    /usr/bin/python3 tests/bench/weights_catalogue.py FOLDER [SOURCES]
    /usr/bin/time -v deviascope weigh FOLDER/weights.toml -o FOLDER/results
"""
import pathlib
import sys

import numpy
from astropy.io import fits

folder = pathlib.Path(sys.argv[1])
n = int(float(sys.argv[2])) if len(sys.argv) > 2 else 10_000_000
folder.mkdir(parents=True, exist_ok=True)
random = numpy.random.default_rng(20261202)

columns = {
    "RA": ("D", 360 * random.random(n)),
    "DEC": ("D", numpy.degrees(numpy.arcsin(2 * random.random(n) - 1))),
    "S": ("E", 0.7 * (1 - random.random(n)) ** (-1 / 1.1)),
    "Z": ("E", 0.9 * random.gamma(2.0, size=n) ** (1 / 1.5)),
    "ALPHA": ("E", random.normal(0.75, 0.2, n)),
}
fits.BinTableHDU.from_columns(
    [fits.Column(name=name, format=form, array=values) for name, (form, values) in columns.items()],
    name="SOURCES",
).writeto(folder / "catalogue.fits", overwrite=True)

job = """[job]
seed = 1
nside = 64
[velocity]
prior = "free-velocity"
[intrinsic]
prior = "free-intrinsic"
[[survey]]
name = "dunlin"
catalogue = "catalogue.fits"
frame = "galactic"
columns = { lon = "RA", lat = "DEC", flux = "S", redshift = "Z", alpha = "ALPHA" }
exclude = [ { band = 10.0, frame = "galactic" } ]
weights = "measure"
"""
fluxes = [1.0, 1.3, 1.8, 3.0, "inf"]
redshifts = [0.0, 0.4, 0.7, 1.0, 1.3, 1.7, "inf"]
for i in range(4):
    for j in range(6):
        job += (f'[[survey.bin]]\nname = "box-{i}-{j}"\nselect = {{ flux = [{fluxes[i]}, {fluxes[i + 1]}], '
                f"redshift = [{redshifts[j]}, {redshifts[j + 1]}] }}\n")
(folder / "weights.toml").write_text(job)
