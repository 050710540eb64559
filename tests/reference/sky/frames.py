# SPDX-License-Identifier: GPL-2.0-or-later
"""frames.py FOLDER: compares rotated directions with pyerfa; exits 1 where one is off by over 2e-15.

FOLDER/icrs, FOLDER/galactic, FOLDER/ecliptic: the same directions, float64 (n, 3).
"""
import sys

import erfa
import numpy

vectors = {
    name: numpy.fromfile(f"{sys.argv[1]}/{name}").reshape(-1, 3)
    for name in ("icrs", "galactic", "ecliptic")
}
ra, dec = erfa.c2s(vectors["icrs"])
expected = {
    "galactic": erfa.s2c(*erfa.icrs2g(ra, dec)),
    "ecliptic": erfa.s2c(*erfa.eqec06(2451545.0, 0.0, ra, dec)),
}
wrong = 0
for name, theirs in expected.items():
    off = numpy.linalg.norm(theirs - vectors[name], axis=1).max()
    if not off < 2e-15:
        print(f"{name}: off by {off}")
        wrong = 1
sys.exit(wrong)
