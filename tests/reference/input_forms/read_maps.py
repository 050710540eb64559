# SPDX-License-Identifier: GPL-2.0-or-later
"""read_maps.py FOLDER SURVEY BIN NSIDE: exits 1 unless healpy reads from the maps in FOLDER what counts.h5 beside it holds."""
import sys

import h5py
import healpy
import numpy

folder, survey, name, nside = sys.argv[1:]
n_pixels = 12 * int(nside) ** 2
with h5py.File(f"{folder}/counts.h5") as file:
    group = file["counts"][survey]
    counts = group["bins"][name]
    footprint = group["footprints"][str(counts.attrs["footprint"])]
    pixel = footprint["pixel"][:]
    wanted_counts = numpy.full(n_pixels, healpy.UNSEEN)
    wanted_counts[pixel] = counts[:]
    wanted_exposure = numpy.zeros(n_pixels)
    wanted_exposure[pixel] = footprint["exposure"][:]
for kind, wanted in (("counts", wanted_counts), ("exposure", wanted_exposure)):
    got, header = healpy.read_map(f"{folder}/maps/{survey}/{name}-{kind}.fits", dtype=numpy.float64, h=True)
    if got.tobytes() != wanted.tobytes():
        sys.exit(f"healpy reads another map of {kind}")
    if dict(header)["COORDSYS"] != "C":
        sys.exit("the frame is lost")
