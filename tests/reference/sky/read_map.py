# SPDX-License-Identifier: GPL-2.0-or-later
"""read_map.py MAP VALUES NSIDE COORDSYS: exits 1 unless healpy reads from MAP the float64 VALUES, bit for bit.

NaN in VALUES stands for UNSEEN. Also checks the header cards and that the file keeps the FITS standard.
"""
import sys

import healpy
import numpy
from astropy.io import fits

path, values_path, nside, coordsys = sys.argv[1:]
nside = int(nside)
values = numpy.fromfile(values_path)
values[numpy.isnan(values)] = healpy.UNSEEN
read = healpy.read_map(path, dtype=numpy.float64)
if read.dtype != numpy.float64 or read.tobytes() != values.tobytes():
    sys.exit(f"healpy reads other values: {numpy.flatnonzero(read != values)[:5]}")
with fits.open(path) as file:
    file.verify("exception")
    header = file[1].header
    found = [header[key] for key in ("PIXTYPE", "ORDERING", "NSIDE", "FIRSTPIX", "LASTPIX", "INDXSCHM", "OBJECT", "COORDSYS")]
    wanted = ["HEALPIX", "RING", nside, 0, 12 * nside**2 - 1, "IMPLICIT", "FULLSKY", coordsys]
    if found != wanted:
        sys.exit(f"header: {found} instead of {wanted}")
    if header["TTYPE1"] != "EXPOSURE" or header["TUNIT1"] != "1":
        sys.exit("the column lost its name or unit")
    if file[1].data.dtype.itemsize * len(file[1].data) != 8 * len(values):
        sys.exit("the table holds more than the map")
