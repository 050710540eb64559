# SPDX-License-Identifier: GPL-2.0-or-later
"""read_mask.py FOLDER: copies published maps into FOLDER, in RING and NESTED, and what healpy reads from them.

mask.fits, mask-nested.fits, mask.values; band.fits, band.values (NaN where UNSEEN); and the exposure of
jobs by nside and frame: exposure-16-galactic, exposure-64-galactic, exposure-32-icrs (float64, RING).
"""
import shutil
import sys

import erfa
import healpy
import numpy

folder = sys.argv[1]
data = "/usr/share/healpy/test/data/"
names = {
    "mask": data + "wmap_temperature_analysis_mask_r9_7yr_v4_udgraded32.fits",
    "band": data + "wmap_band_iqumap_r9_7yr_W_v4_udgraded32_masked.fits",
}
for name, path in names.items():
    shutil.copy(path, f"{folder}/{name}.fits")
    values = healpy.read_map(path, dtype=numpy.float64)
    values[values < -1.6e30] = numpy.nan
    values.tofile(f"{folder}/{name}.values")
mask = numpy.fromfile(f"{folder}/mask.values")
healpy.write_map(
    f"{folder}/mask-nested.fits", healpy.reorder(mask, r2n=True), nest=True, dtype=numpy.float32, coord="G"
)


def mean_of_sub_pixels(at_fine, nside, nside_fine):
    means = at_fine.reshape(-1, (nside_fine // nside) ** 2).mean(axis=1)  # NESTED
    return means[healpy.ring2nest(nside, numpy.arange(len(means)))]


mean_of_sub_pixels(healpy.reorder(mask, r2n=True), 16, 32).tofile(f"{folder}/exposure-16-galactic")
healpy.ud_grade(mask, 64).tofile(f"{folder}/exposure-64-galactic")
points = healpy.pix2vec(128, numpy.arange(12 * 128**2), nest=True)
lon, lat = erfa.icrs2g(*erfa.c2s(numpy.array(points).T))
sampled = mask[healpy.ang2pix(32, numpy.degrees(lon), numpy.degrees(lat), lonlat=True)]
mean_of_sub_pixels(sampled, 32, 128).tofile(f"{folder}/exposure-32-icrs")
