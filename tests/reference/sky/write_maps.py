# SPDX-License-Identifier: GPL-2.0-or-later
"""write_maps.py FOLDER: writes one map in many forms, with the values it was made from beside it.

For each FOLDER/NAME.fits: FOLDER/NAME.values, float64 in RING order, NaN where there is none; and a
line `NAME nside frame` in FOLDER/list.
"""
import sys

import healpy
import numpy
from astropy.io import fits

folder = sys.argv[1]
random = numpy.random.default_rng(20260817)
listing = open(folder + "/list", "w")


def expect(name, nside, frame, values):
    values = numpy.array(values, dtype=numpy.float64)
    values[values == numpy.float64(numpy.float32(healpy.UNSEEN))] = numpy.nan
    values[values == healpy.UNSEEN] = numpy.nan
    values.tofile(f"{folder}/{name}.values")
    listing.write(f"{name} {nside} {frame}\n")


def sky(nside, dtype):
    npix = healpy.nside2npix(nside)
    if numpy.dtype(dtype).kind == "f":
        values = random.normal(size=npix).astype(dtype)
        values[3] = healpy.UNSEEN
        values[4] = numpy.nan
    else:
        limits = numpy.iinfo(dtype)
        values = random.integers(max(limits.min, -(2**52)), min(limits.max, 2**52), size=npix).astype(dtype)
    return values


def from_healpy():
    frames = {"G": "galactic", "C": "icrs", "E": "ecliptic", None: "none"}
    for nside in (1, 2, 32, 64):
        for dtype in (numpy.float32, numpy.float64, numpy.int16, numpy.int32, numpy.int64):
            for nest in (False, True):
                coord = list(frames)[(nside + nest) % 4]
                values = sky(nside, dtype)
                name = f"full-{nside}-{numpy.dtype(dtype).name}-{'nested' if nest else 'ring'}"
                healpy.write_map(f"{folder}/{name}.fits", values, nest=nest, dtype=dtype, coord=coord)
                expect(name, nside, frames[coord], healpy.reorder(values, n2r=True) if nest else values)
    for nside in (16, 64):
        for nest in (False, True):
            values = numpy.full(healpy.nside2npix(nside), healpy.UNSEEN)
            kept = random.choice(len(values), size=700, replace=False)
            values[kept] = random.normal(size=700)
            values[-1] = 0.25  # a large index: healpy 1.16.1 fails on small ones
            name = f"partial-{nside}-{'nested' if nest else 'ring'}"
            healpy.write_map(
                f"{folder}/{name}.fits", values, nest=nest, dtype=numpy.float64, coord="G", partial=True
            )
            expect(name, nside, "galactic", healpy.reorder(values, n2r=True) if nest else values)
    two = [sky(8, numpy.float64), sky(8, numpy.float64)]
    healpy.write_map(f"{folder}/columns.fits", two, dtype=numpy.float64, column_names=["A", "B"])
    expect("columns", 8, "none", two[0])
    healpy.write_map(f"{folder}/packed.fits.gz", two[1], dtype=numpy.float64)
    import shutil

    shutil.move(f"{folder}/packed.fits.gz", f"{folder}/packed.fits")  # compressed, by content
    expect("packed", 8, "none", two[1])


def from_astropy(name, columns, values, nside=2, before=(), **cards):
    table = fits.BinTableHDU.from_columns(columns)
    table.header.update(PIXTYPE="HEALPIX", ORDERING="RING", NSIDE=nside, **cards)
    fits.HDUList([fits.PrimaryHDU(), *before, table]).writeto(f"{folder}/{name}.fits")
    expect(name, nside, "galactic" if "COORDSYS" in cards else "none", values)


def special_forms():
    unsigned = numpy.arange(48, dtype=numpy.uint16) + 65000
    from_astropy("unsigned", [fits.Column("N", "I", bzero=32768, array=unsigned)], unsigned, COORDSYS="galactic")
    counts = numpy.arange(48, dtype=numpy.int32)
    with_null = counts.astype(float)
    with_null[7] = numpy.nan
    from_astropy("null", [fits.Column("N", "J", null=7, array=counts)], with_null, COORDSYS=" g ")
    raw = numpy.arange(48, dtype=numpy.int16)
    from_astropy("scaled", [fits.Column("W", "I", array=raw)], raw * 0.25 + 1.0)
    fits.setval(f"{folder}/scaled.fits", "TSCAL1", value=0.25, ext=1)  # astropy 5.2.1 cannot write
    fits.setval(f"{folder}/scaled.fits", "TZERO1", value=1.0, ext=1)  # scaled integers itself
    truth = raw % 3 == 0
    from_astropy("logical", [fits.Column("KEEP", "L", array=truth)], truth)
    pixel = numpy.array([47, 3, 20], dtype=numpy.int64)
    values = numpy.full(48, numpy.nan)
    values[pixel] = [0.5, 0.75, 1.0]
    text = fits.Column("NOTE", "4A", array=["a", "b", "c"])
    columns = [
        text,
        fits.Column("Pixel", "K", array=pixel),
        fits.Column("W", "E", array=values[pixel].astype(numpy.float32)),
    ]
    other = fits.BinTableHDU.from_columns([fits.Column("X", "D", array=[1.0])], name="NOTES")
    from_astropy("sparse", columns, values, before=[other], INDXSCHM="EXPLICIT", OBJECT="PARTIAL")


from_healpy()
special_forms()
listing.close()
