# SPDX-License-Identifier: GPL-2.0-or-later
"""Reads mock catalogues with astropy and compares them with numbers given as text.

usage: read_back.py FOLDER, which holds
  double.fits, single.fits, double.csv   the same rows, written by the program
  rows.txt    one row a line: lon lat alpha flux redshift magnitude size, 17 digits
  truth.toml  must be TOML that the standard library understands, where it has a reader
"""
import sys
from pathlib import Path

import numpy
from astropy.io import fits
from astropy.table import Table

folder = Path(sys.argv[1])
names = ["RA", "DEC", "ALPHA", "FLUX", "REDSHIFT", "MAGNITUDE", "SIZE"]
rows = numpy.loadtxt(folder / "rows.txt")

with fits.open(folder / "double.fits") as file:
    file.verify("exception")
    table = file["SOURCES"]
    assert table.columns.names == names, table.columns.names
    assert table.columns.formats == ["D"] * 7, table.columns.formats
    assert table.columns["RA"].unit == "deg"
    assert table.header["SEED"] == 11
    assert table.header["SKYFRAME"] == "icrs"
    assert len(table.data) == len(rows)
    for number, name in enumerate(names):
        assert (table.data[name] == rows[:, number]).all(), name

with fits.open(folder / "single.fits") as file:
    file.verify("exception")
    table = file["SOURCES"]
    assert table.columns.formats == ["D", "D"] + ["E"] * 5, table.columns.formats
    single = rows.copy()
    single[:, 2:] = rows[:, 2:].astype("f4")
    kept = (single[:, 3] >= 2.1) & (single[:, 3] < 40.0)
    assert kept.sum() == len(table.data), (kept.sum(), len(table.data))
    for number, name in enumerate(names):
        assert (table.data[name] == single[kept, number]).all(), name

table = Table.read(folder / "double.csv", format="ascii.csv")
assert table.colnames == ["R,A"] + names[1:], table.colnames
for number, name in enumerate(table.colnames):
    assert (numpy.asarray(table[name]) == rows[:, number]).all(), name

try:
    import tomllib
except ImportError:
    sys.exit(0)
with open(folder / "truth.toml", "rb") as file:
    truth = tomllib.load(file)
assert truth["mock"]["seed"] == 11
assert truth["survey"][0]["sources"]["rows"] == len(rows)
assert truth["survey"][0]["keep"]["flux"] == [2.1, 40.0]
assert [e["region"] for e in truth["survey"][0]["sources"]["excluded"]] != []
