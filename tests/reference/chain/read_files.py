# SPDX-License-Identifier: GPL-2.0-or-later
"""Reads counts.h5 and chains.h5 of a folder with h5py and h5dump; see README.md."""
import subprocess
import sys

import h5py
import numpy as np

folder = sys.argv[1]


def texts(dataset):
    return [text.decode("utf-8") for text in dataset[()]]


def text(attribute):
    return attribute.decode("utf-8") if isinstance(attribute, bytes) else str(attribute)


def places(rows):
    row, replicate, walker = np.meshgrid(rows, range(2), range(4), indexing="ij")
    return ((row * 10 + replicate) * 10 + walker).astype(float)


def same(found, expected):
    expected = np.asarray(expected)
    assert found.shape == expected.shape, (found, expected.shape)
    assert np.array_equal(found[()], expected, equal_nan=expected.dtype.kind == "f"), found


def explains_itself(name, thing):
    assert text(thing.attrs["meaning"]), name
    if isinstance(thing, h5py.Dataset):
        axes = text(thing.attrs["dimensions"]).split(" x ")
        assert len(axes) == thing.ndim, (name, axes)
        assert thing.dtype.kind == "S" or "unit" in thing.attrs or name.endswith(
            ("draws", "coordinates")), name
        if thing.size:
            assert thing.fletcher32, name
            assert thing.compression in (None, "gzip"), name
            assert thing.shuffle == (thing.compression == "gzip"), name


def check_counts(counts):
    assert (counts.attrs["nside"], text(counts.attrs["ordering"])) == (4, "RING")
    assert text(counts.attrs["frame"]) == "ecliptic"
    assert sorted(counts) == ["dunlin", "lantern"]
    assert (counts["lantern"].attrs["order"], counts["dunlin"].attrs["order"]) == (1, 2)
    dunlin = counts["dunlin"]
    same(dunlin["footprints/1/pixel"], np.arange(0, 192, 3))
    same(dunlin["footprints/1/exposure"], 1.0 / np.arange(1, 65))
    same(dunlin["bins/faint"], np.arange(64, dtype=np.uint32) ** 2)
    same(dunlin["bins/bright"], np.zeros(64, dtype=np.uint32))
    assert dunlin["bins/faint"].attrs["footprint"] == 1
    same(counts["lantern/bins/all"], np.array([7, 4294967295], dtype=np.uint32))
    assert counts["lantern/bins/all"].attrs["footprint"] == 2
    cuts = dunlin["cuts"]
    assert texts(cuts["name"]) == ["band = 15.0, galactic", "flux: outside"]
    assert cuts.attrs["rows_read"] == cuts["rows_removed"][()].sum() + cuts.attrs["rows_kept"]
    assert cuts.attrs["pixels_total"] == cuts["pixels_removed"][()].sum() + cuts.attrs["pixels_kept"]
    assert texts(cuts["warnings"]) == ["the disc at (83.6°, 22.0°) removed nothing"]


def check_chain(chain):
    assert (text(chain.attrs["format"]), chain.attrs["schema"]) == ("deviascope chain", 1)
    assert texts(chain["parameters/name"])[:3] == ["velocity.x", "velocity.y", "velocity.z"]
    assert texts(chain["parameters/unit"]) == ["c"] * 3 + ["1"] * 3 + ["1/sr"]
    assert texts(chain["parameters/role"]) == ["sampled"] * 3 + ["constant"] * 3 + ["redrawn"]
    assert texts(chain["parameters/meaning"])[6] == "sources per steradian"
    assert texts(chain["parameters/vectors/name"]) == ["velocity", "intrinsic.all"]
    same(chain["parameters/vectors/first"], [0, 3])
    same(chain["parameters/vectors/amplitude_free"], [1, 0])
    place = places(range(5))
    same(chain["draws"], (place[..., None] * 10 + np.arange(7)) / 8)
    same(chain["log_posterior"], -place / 8)
    same(chain["log_likelihood"], -place / 16)
    warm = (places(range(1000, 1003))[..., None] * 10 + np.arange(7)) / 8
    warm[..., 6] = np.nan
    same(chain["warm_up/draws"], warm)
    same(chain["warm_up/step"], [64, 128, 192])
    same(chain["state/rows"], [3, 3, 5])
    same(chain["state/step"], [201, 201, 207])
    same(chain["state/coordinates"][2].reshape(-1), 5 + np.arange(40) / 1024)
    assert chain["state"].attrs["store_every"] == 3
    assert chain["state"].attrs["end_of_warm_up"] == 192
    assert texts(chain["kernel_tally/kernel"]) == ["stretch", "differential-evolution",
                                                   "independence"]
    same(chain["kernel_tally/tried"], [[300, 600, 0], [300, 600, 0], [500, 1000, 0]])
    assert text(chain["outcome"].attrs["end"]) == "converged"
    check_job(chain["job"])
    check_counts(chain["counts"])


def check_job(job):
    assert texts(job["text"]) == [
        '[job]\ntitle = "Dunlin and Lantern: β and D"\nseed = 20260817\n']
    assert texts(job["companions/text"]) == ["max = 0.05\n", ""]
    assert texts(job["inputs/sha256"]) == ["a" * 64, "0" * 64]
    same(job["inputs/bytes"], [123456789012, 0])
    assert job.attrs["seed"] == 20260817
    assert text(job.attrs["ended"]) == "2026-08-17T11:30:00Z"
    assert job["sampler"].attrs["effective_draws"] == 1234.5


def check_dump(path, words):
    dump = subprocess.run(["h5dump", "-H", path], capture_output=True, text=True)
    assert dump.returncode == 0 and not dump.stderr, dump.stderr
    for word in words:
        assert word in dump.stdout, word


with h5py.File(folder + "/chains.h5", "r") as chain:
    chain.visititems(explains_itself)
    check_chain(chain)
with h5py.File(folder + "/counts.h5", "r") as counts:
    counts.visititems(explains_itself)
    assert text(counts.attrs["format"]) == "deviascope counts"
    assert text(counts.attrs["digest"]) == "0123abcd"
    check_counts(counts["counts"])
check_dump(folder + "/chains.h5",
           ['DATASET "draws"', "( 5, 2, 4, 7 ) / ( H5S_UNLIMITED, 2, 4, 7 )", 'GROUP "dunlin"',
            'DATASET "faint"', 'ATTRIBUTE "schema"', 'GROUP "kernel_tally"', "H5T_CSET_UTF8"])
check_dump(folder + "/counts.h5", ['DATASET "exposure"', 'ATTRIBUTE "ordering"'])
print("all as expected")
