# SPDX-License-Identifier: GPL-2.0-or-later
"""write_forms.py FOLDER: writes the same sources in every form of input.

Into FOLDER: table.* (catalogues), map-*.fits (counts), and the lists `tables` (one file a line) and
`map-list` (one file a line).
"""
import gzip
import shutil
import sys

import h5py
import healpy
import numpy
from astropy.io import fits

folder = sys.argv[1]
random = numpy.random.default_rng(20260817)
n, nside = 60_000, 32
lon = random.uniform(0.0, 360.0, n)
lat = numpy.degrees(numpy.arcsin(random.uniform(-1.0, 1.0, n)))
flux = 10.0 * random.random(n) ** -0.8

table = fits.BinTableHDU.from_columns(
    [fits.Column("RA", "D", array=lon), fits.Column("DEC", "D", array=lat), fits.Column("S", "D", array=flux)]
)
table.writeto(f"{folder}/table.fits")
with open(f"{folder}/table.csv", "w", encoding="ascii") as file:
    file.write("RA,DEC,S\n")
    file.writelines(f"{a!r},{b!r},{c!r}\n" for a, b, c in zip(lon.tolist(), lat.tolist(), flux.tolist()))
for name in ("table.fits", "table.csv"):
    with open(f"{folder}/{name}", "rb") as plain, gzip.open(f"{folder}/{name}.gz", "wb", 1) as packed:
        shutil.copyfileobj(plain, packed)
with h5py.File(f"{folder}/table.h5", "w") as file:
    for name, column in (("RA", lon), ("DEC", lat), ("S", flux)):
        file[name] = column
with h5py.File(f"{folder}/packed.h5", "w") as file:
    group = file.create_group("deep/sources")
    for name, column in (("RA", lon), ("DEC", lat), ("S", flux)):
        group.create_dataset(name, data=column, chunks=(7000,), compression="gzip", shuffle=True)
with open(f"{folder}/tables", "w") as listing:
    listing.write("table.fits\ntable.fits.gz\ntable.csv\ntable.csv.gz\ntable.h5\npacked.h5 deep/sources\n")

bright = flux >= 15.0
maps = open(f"{folder}/map-list", "w")


def write(name, values, **options):
    healpy.write_map(f"{folder}/map-{name}.fits", values, **options)
    maps.write(f"map-{name}.fits\n")


for fine in (nside, 2 * nside, 8 * nside):
    pixel = healpy.ang2pix(fine, lon[bright], lat[bright], lonlat=True)
    count = numpy.bincount(pixel, minlength=12 * fine**2)
    for dtype in (numpy.int16, numpy.int32, numpy.int64, numpy.float32, numpy.float64):
        nest = dtype in (numpy.int32, numpy.float64)
        values = healpy.reorder(count, r2n=True) if nest else count
        write(f"{fine}-{numpy.dtype(dtype).name}", values.astype(dtype), nest=nest, dtype=dtype, coord="C")
    # Below the cut of the job nothing is exposed: there a map may hold UNSEEN, NaN or no pixel.
    lowest = healpy.pix2ang(fine, numpy.arange(12 * fine**2), lonlat=True)[1] < -45.0
    hidden = numpy.where(lowest, healpy.UNSEEN, count.astype(float))
    write(f"{fine}-unseen", hidden, dtype=numpy.float32, coord="C")
    write(f"{fine}-nan", numpy.where(lowest, numpy.nan, count.astype(float)), dtype=numpy.float64, coord="C")
    write(f"{fine}-partial", hidden, dtype=numpy.float64, coord="C", partial=True)
    nested = healpy.reorder(hidden, r2n=True)
    write(f"{fine}-partial-nested", nested, nest=True, dtype=numpy.float64, coord="C", partial=True)
    one = fits.BinTableHDU.from_columns([fits.Column("N", "J", array=count.astype(numpy.int32))])  # one a row
    one.header.update(PIXTYPE="HEALPIX", ORDERING="RING", NSIDE=fine, INDXSCHM="IMPLICIT", COORDSYS="celestial")
    one.writeto(f"{folder}/map-{fine}-one.fits")
    maps.write(f"map-{fine}-one.fits\n")
maps.close()
