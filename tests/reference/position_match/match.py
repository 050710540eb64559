# SPDX-License-Identifier: GPL-2.0-or-later
"""Matches of two lists of positions by a k-d tree (scipy.spatial.cKDTree): prints, for each
position of the second list (argument 2), 1 where one of the first (argument 1) lies within the
radius (argument 3, radians), else 0. Lists: three doubles a position, native order."""
import sys

import numpy as np
from scipy.spatial import cKDTree

first, second = (np.fromfile(path).reshape(-1, 3) for path in sys.argv[1:3])
chord = 2.0 * np.sin(float(sys.argv[3]) / 2.0)
near = cKDTree(first).query_ball_point(second, chord, return_length=True)
print("\n".join("1" if n > 0 else "0" for n in near))
