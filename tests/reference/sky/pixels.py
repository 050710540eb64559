# SPDX-License-Identifier: GPL-2.0-or-later
"""pixels.py FOLDER NSIDE...: compares pixel numbers in FOLDER with healpy's; exits 1 where one differs.

FOLDER/directions: float64 (n, 3). FOLDER/pixels-NSIDE: int64 (n,). FOLDER/nested-NSIDE: the same
pixels in NESTED order. FOLDER/centres-NSIDE: float64 (n, 3), centres of those pixels.
"""
import sys

import healpy
import numpy

folder, nsides = sys.argv[1], [int(word) for word in sys.argv[2:]]
x, y, z = numpy.fromfile(folder + "/directions").reshape(-1, 3).T
wrong = 0
for nside in nsides:
    pixels = numpy.fromfile(f"{folder}/pixels-{nside}", dtype=numpy.int64)
    nested = numpy.fromfile(f"{folder}/nested-{nside}", dtype=numpy.int64)
    centres = numpy.fromfile(f"{folder}/centres-{nside}").reshape(-1, 3)
    differ = {
        "pixels": numpy.flatnonzero(healpy.vec2pix(nside, x, y, z) != pixels),
        "nested": numpy.flatnonzero(healpy.ring2nest(nside, pixels) != nested),
        "ring": numpy.flatnonzero(healpy.nest2ring(nside, nested) != pixels),
        "centres": numpy.flatnonzero(
            numpy.abs(numpy.array(healpy.pix2vec(nside, pixels)).T - centres).max(axis=1) > 4e-16
        ),
    }
    for what, rows in differ.items():
        if len(rows):
            at = rows[0]
            print(f"nside {nside}: {len(rows)} {what} differ, first ({x[at]!r}, {y[at]!r}, {z[at]!r})")
            wrong = 1
sys.exit(wrong)
