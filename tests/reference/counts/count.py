# SPDX-License-Identifier: GPL-2.0-or-later
"""Makes a random catalogue with an exposure map and counts it, without the program.

Usage: count.py FOLDER JOB_FRAME CATALOGUE_FRAME SEED
Writes into FOLDER: dunlin-a.fits, dunlin-b.csv (the catalogue in two files), exposure.fits,
expected.txt (kept pixel, exposure, counts of three bins) and cuts.txt (rows removed by cut).
"""
import sys

import erfa
import healpy
import numpy as np
from astropy.io import fits

folder, job_frame, catalogue_frame, seed = sys.argv[1:5]
random = np.random.default_rng(int(seed))
nside, nside_map, n_sources = 32, 128, 100_000

from_icrs = {
    "icrs": np.eye(3),
    "galactic": np.array([erfa.icrs2g(*erfa.c2s(axis)) for axis in np.eye(3)]),
    "ecliptic": erfa.ecm06(erfa.DJ00, 0.0),
}
from_icrs["galactic"] = np.array([erfa.s2c(*angles) for angles in from_icrs["galactic"]]).T


def rotated(vectors, old, new):
    return vectors @ (from_icrs[new] @ from_icrs[old].T).T


# A catalogue: a NaN here and there, redshifts as scaled 16-bit integers with a null value.
lon = random.uniform(0.0, 360.0, n_sources)
lat = np.degrees(np.arcsin(random.uniform(-1.0, 1.0, n_sources)))
lon[random.random(n_sources) < 0.002] = np.nan
flux = 10.0 * random.random(n_sources) ** -0.8
flux[random.random(n_sources) < 0.01] = np.nan
redshift_raw = random.integers(0, 4000, n_sources).astype(np.int16)
redshift_raw[random.random(n_sources) < 0.02] = -32768
redshift = np.where(redshift_raw == -32768, np.nan, redshift_raw * 0.0009765625)

half = n_sources // 2
table = fits.BinTableHDU.from_columns([
    fits.Column("ID", "12A", array=np.char.mod("J%09d", np.arange(half))),
    fits.Column("LON", "D", "deg", array=lon[:half]),
    fits.Column("Z", "I", null=-32768, array=redshift_raw[:half]),
    fits.Column("LAT", "D", "deg", array=lat[:half]),
    fits.Column("S", "D", "mJy", array=flux[:half]),
], name="SOURCES")
table.header["TSCAL3"] = 0.0009765625
table.header["TZERO3"] = 0.0
table.writeto(f"{folder}/dunlin-a.fits")


def field(value):
    return "" if np.isnan(value) else repr(float(value))


with open(f"{folder}/dunlin-b.csv", "w", encoding="ascii") as file:
    file.write("Z,note,S,LAT,LON\r\n")
    for row in range(half, n_sources):
        note = '"a ""quoted"", note"' if row % 3 == 0 else ""
        values = [field(column[row]) for column in (flux, lat, lon)]
        file.write(",".join([field(redshift[row]), note, *values]) + "\r\n")

# An exposure map, galactic, NESTED, single precision, finer than the job's pixels, with holes.
directions = np.array(healpy.pix2vec(nside_map, np.arange(12 * nside_map**2))).T
exposure = (0.75 + 0.25 * directions[:, 0] * directions[:, 2]).astype(np.float32)
exposure[directions[:, 1] > 0.9] = 0.0
exposure[random.random(exposure.size) < 0.05] = 0.0
exposure[random.random(exposure.size) < 0.01] = healpy.UNSEEN
healpy.write_map(f"{folder}/exposure.fits", healpy.reorder(exposure, r2n=True), nest=True,
                 coord="G", dtype=np.float32)
exposure = np.where(exposure == np.float32(healpy.UNSEEN), 0.0, exposure.astype(float))


def exposure_at(vectors):  # of the job's frame
    return exposure[healpy.vec2pix(nside_map, *rotated(vectors, job_frame, "galactic").T)]


# Pixels: exclusions by centre, exposure as the mean of the 16 sub-pixels of nside x 4.
centres = np.array(healpy.pix2vec(nside, np.arange(12 * nside**2))).T
galactic = rotated(centres, job_frame, "galactic")
icrs = rotated(centres, job_frame, "icrs")
disc = healpy.ang2vec(83.6, 22.0, lonlat=True)
excluded = [
    np.abs(galactic[:, 2]) < np.sin(np.radians(12.0)),
    np.linalg.norm(icrs - disc, axis=1) <= 2.0 * np.sin(np.radians(6.0) / 2.0),
    icrs[:, 2] < np.sin(np.radians(-40.0)),
]
sub_pixels = np.array(healpy.pix2vec(4 * nside, np.arange(12 * 16 * nside**2), nest=True)).T
means = exposure_at(sub_pixels).reshape(-1, 16).mean(axis=1)
means = means[healpy.ring2nest(nside, np.arange(12 * nside**2))]

# Sources, cut after cut.
ok = np.isfinite(lon) & np.isfinite(lat)
removed = {"position": n_sources - ok.sum()}
vectors = healpy.ang2vec(np.where(ok, lon, 0.0), lat, lonlat=True)
vectors = rotated(vectors, catalogue_frame, job_frame)
pixel = healpy.vec2pix(nside, *vectors.T)


def remove(name, bad):
    global ok
    removed[name] = int((ok & bad).sum())
    ok = ok & ~bad


remove("flux missing", np.isnan(flux))
remove("select", ~(flux >= 12.0))
for name, cut in zip(["band", "disc", "below"], excluded):
    remove(name, cut[pixel])
remove("exposure", means[pixel] == 0.0)
remove("hole", exposure_at(vectors) == 0.0)
bins = [
    (flux >= 12.0) & (flux < 20.0) & (redshift >= 0.5) & (redshift < 2.0),
    (flux >= 20.0) & (flux < 100.0),
    (flux >= 100.0) & (redshift >= 0.0) & (redshift < 1.0),
]
might = (flux < 20.0) | (flux >= 100.0)  # the bins that ask for a redshift
in_none = ~(bins[0] | bins[1] | bins[2])
remove("redshift missing", in_none & might & np.isnan(redshift))
remove("in no bin", in_none & ~np.isnan(redshift))

kept = ~(excluded[0] | excluded[1] | excluded[2]) & (means > 0.0)
counts = [np.bincount(pixel[ok & inside], minlength=12 * nside**2) for inside in bins]
with open(f"{folder}/expected.txt", "w", encoding="ascii") as file:
    for p in np.flatnonzero(kept):
        file.write(f"{p} {means[p]!r} {counts[0][p]} {counts[1][p]} {counts[2][p]}\n")
with open(f"{folder}/cuts.txt", "w", encoding="ascii") as file:
    file.writelines(f"{n}\n" for n in removed.values())
