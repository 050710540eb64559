# SPDX-License-Identifier: GPL-2.0-or-later
"""Reads a folder of results with programs that do not know us. Usage: check_results.py FOLDER"""
import json
import re
import subprocess
import sys
import xml.etree.ElementTree as ElementTree
from pathlib import Path

import astropy.units as u
import healpy
import numpy as np
from astropy.coordinates import SkyCoord
from astropy.io import fits

folder = Path(sys.argv[1])
faults = []


def check(condition, what):
    if not condition:
        faults.append(what)


def unit_vectors(lon_deg, lat_deg):
    return np.array(healpy.ang2vec(lon_deg, lat_deg, lonlat=True))


summary = json.loads((folder / "summary.json").read_text())
draws = fits.getdata(folder / "draws.fits", 1)


# ---- exported draws ----
def check_draws(vector):
    xyz = np.stack([draws[f"{vector}.{axis}"] for axis in "xyz"], axis=1)
    check(np.allclose(draws[f"{vector}.amplitude"], np.linalg.norm(xyz, axis=1), rtol=1e-14),
          f"{vector}: amplitudes")
    galactic = SkyCoord(l=draws[f"{vector}.l_deg"] * u.deg, b=draws[f"{vector}.b_deg"] * u.deg,
                        frame="galactic")
    icrs = SkyCoord(ra=draws[f"{vector}.ra_deg"] * u.deg, dec=draws[f"{vector}.dec_deg"] * u.deg)
    # astropy's galactic frame and ours differ by at most 0.1 arcsec (IAU 1958 by way of FK5).
    check(np.max(galactic.icrs.separation(icrs).arcsec) < 0.1, f"{vector}: frames")


# ---- maps and regions ----
def check_maps(name, vector):
    means = {}
    for frame, card in (("galactic", "G"), ("icrs", "C")):
        path = folder / f"direction-{name}-{frame}.fits"
        header = fits.getheader(path, 1)
        for key, value in (("PIXTYPE", "HEALPIX"), ("ORDERING", "RING"), ("INDXSCHM", "IMPLICIT"),
                           ("OBJECT", "FULLSKY"), ("COORDSYS", card), ("FIRSTPIX", 0),
                           ("LASTPIX", 12 * header["NSIDE"] ** 2 - 1),
                           ("TTYPE1", "DIRECTION_PROBABILITY")):
            check(header.get(key) == value, f"{path.name}: {key} is {header.get(key)}")
        values = healpy.read_map(path, dtype=float)
        check(abs(values.sum() - 1.0) < 1e-9 and values.min() >= 0.0, f"{path.name}: sum")
        centres = np.array(healpy.pix2vec(header["NSIDE"], np.arange(values.size)))
        means[frame] = centres @ values
        lon, lat = (("l", "b"), ("ra", "dec"))[frame == "icrs"]
        truth = unit_vectors(draws[f"{vector}.{lon}_deg"], draws[f"{vector}.{lat}_deg"]).mean(axis=0)
        # A pixel is 0.9 deg at most; a kernel of bandwidth 0.3 sd shortens a mean by 5 per cent.
        check(np.linalg.norm(means[frame] - truth) < 0.05, f"{path.name}: mean {means[frame]} {truth}")


def order_and_index(uniq):
    order = (int(uniq).bit_length() - 1) // 2 - 1
    return order, int(uniq) - (4 << (2 * order))


def check_moc(name, vector, level, probability):
    path = folder / f"region{level}-{name}.moc.fits"
    header = fits.getheader(path, 1)
    for key, value in (("MOCVERS", "2.0"), ("MOCDIM", "SPACE"), ("ORDERING", "NUNIQ"),
                       ("COORDSYS", "C"), ("TTYPE1", "UNIQ")):
        check(header.get(key) == value, f"{path.name}: {key} is {header.get(key)}")
    check("PIXTYPE" not in header, f"{path.name}: PIXTYPE stands in a MOC 2.0")
    cells = [order_and_index(uniq) for uniq in fits.getdata(path, 1)["UNIQ"]]
    known = set(cells)
    check(len(known) == len(cells), f"{path.name}: a cell twice")
    check(max(order for order, _ in cells) == header["MOCORD_S"], f"{path.name}: MOCORD_S")
    for order, index in cells:
        check(0 <= index < 12 * 4 ** order, f"{path.name}: index {index} at order {order}")
        check(not any((order - up, index >> (2 * up)) in known for up in range(1, order + 1)),
              f"{path.name}: a cell inside another")
        check(index % 4 or not all((order, index + sibling) in known for sibling in range(4))
              or order == 0, f"{path.name}: four siblings are not merged")
    area = sum(4.0 ** -order / 12.0 for order, _ in cells) * 129600.0 / np.pi
    entry = summary["velocity"] if vector == "velocity" else summary["intrinsic"]["dunlin"]
    expected = entry["direction"][f"region{level}"]["area_deg2"]
    check(abs(area / expected - 1.0) < 0.02, f"{path.name}: {area} square degrees, not {expected}")
    deepest = healpy.ang2pix(1 << 29, draws[f"{vector}.ra_deg"], draws[f"{vector}.dec_deg"],
                             nest=True, lonlat=True)
    inside = np.zeros(deepest.size, dtype=bool)
    for order in {order for order, _ in cells}:
        members = np.array([index for at, index in cells if at == order])
        inside |= np.isin(deepest >> (2 * (29 - order)), members)
    check(abs(inside.mean() - probability) < 0.01, f"{path.name}: holds {inside.mean()}")


def check_residuals():
    values = healpy.read_map(folder / "residuals-dunlin.fits", dtype=float)
    seen = values[values != healpy.UNSEEN]
    check(fits.getheader(folder / "residuals-dunlin.fits", 1)["TTYPE1"] == "RESIDUAL", "residuals")
    check(seen.size == values.size and np.all(np.isfinite(seen)), "residuals: all pixels were kept")


# ---- figures and report ----
def pixels_of(path):
    """A picture in RGB, by poppler's own ppm writer or rsvg's png through cairo's surfaces."""
    from matplotlib.image import imread
    return imread(path)[..., :3]


def check_figure(svg):
    tree = ElementTree.parse(svg)
    texts = [text for element in tree.iter() for text in (element.text or "",)]
    check(not any("−0.0 " in text or "nan" in text.split() for text in texts), f"{svg.name}: numbers")
    rendered = folder / "rendered.png"
    subprocess.run(["rsvg-convert", "-d", "240", "-p", "240", "-o", rendered, svg], check=True)
    ours, theirs = pixels_of(svg.with_suffix(".png")), pixels_of(rendered)
    check(abs(ours.shape[0] - theirs.shape[0]) <= 1 and abs(ours.shape[1] - theirs.shape[1]) <= 1,
          f"{svg.name}: sizes {ours.shape} {theirs.shape}")
    rows, columns = (min(ours.shape[axis], theirs.shape[axis]) // 4 * 4 for axis in (0, 1))
    def coarse(picture):
        return picture[:rows, :columns].reshape(rows // 4, 4, columns // 4, 4, 3).mean(axis=(1, 3))
    difference = np.abs(coarse(ours) - coarse(theirs)).mean()
    # Blocks of a sixtieth of an inch differ by the smoothing of edges and letters only.
    check(difference < 0.008, f"{svg.name}: two renderers differ by {difference}")
    pdf = svg.with_suffix(".pdf")
    words = subprocess.run(["pdftotext", pdf, "-"], check=True, capture_output=True, text=True).stdout
    title = tree.getroot().find("{http://www.w3.org/2000/svg}title").text
    check(title.split()[0] in words, f"{pdf.name}: its title is no text")
    fonts = subprocess.run(["pdffonts", pdf], check=True, capture_output=True, text=True).stdout
    rows = fonts.splitlines()[2:]
    check(rows and all(re.search(r"yes\s+yes\s+yes", row) for row in rows),
          f"{pdf.name}: fonts are not embedded subsets with letters:\n{fonts}")


def check_report():
    page = folder / "report.html"
    text = page.read_text()
    said = subprocess.run(["tidy", "-q", "-e", page], capture_output=True, text=True).stderr
    # Tidy knows SVG's elements but not their attributes.
    real = [line for line in said.splitlines()
            if not re.search(r"proprietary attribute|<svg>|<(title|desc|g|path|image|tspan|text|rect|circle|clipPath)", line)]
    check(not real, "report.html: " + "\n".join(real))
    outside = [url for url in re.findall(r"(?:href|src)=\"(\w+:[^\"]*)\"", text) if not url.startswith("data:")]
    check(not outside, f"report.html: needs {outside}")
    ids = re.findall(r"\bid=\"([^\"]*)\"", text)
    check(len(ids) == len(set(ids)), "report.html: an id twice")
    for reference in re.findall(r"url\(#([^)]*)\)", text) + re.findall(r"aria-labelledby=\"([^\"]*)\"", text):
        check(all(part in ids for part in reference.split()), f"report.html: no id {reference}")
    check(all(re.search(r"\d", words) for words in re.findall(r"<desc[^>]*>([^<]*)</desc>", text)),
          "report.html: an alternative text without a number")
    check(len(text) < 3e6, "report.html: size")


for name, vector in (("velocity", "velocity"), ("intrinsic-dunlin", "intrinsic.dunlin")):
    check_draws(vector)
    check_maps(name, vector)
    check_moc(name, vector, 68, 0.6827)
    check_moc(name, vector, 95, 0.9545)
check_residuals()
for svg in sorted(folder.glob("*.svg")):
    check_figure(svg)
check_report()
print("\n".join(faults) if faults else "all as expected")
sys.exit(1 if faults else 0)
