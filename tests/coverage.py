# SPDX-License-Identifier: GPL-2.0-or-later
"""Which lines the tests ran, by stage: lines of src/<stage> and include/deviascope/<stage>.

    cmake -S . -B build-coverage -G Ninja -DDEVIASCOPE_COVERAGE=ON && ninja -C build-coverage
    ctest --test-dir build-coverage -LE long
    python3 tests/coverage.py build-coverage [--missing]

With --missing every line that never ran is listed too. Reads what gcov makes of the counts that
programs built by g++ leave behind.
"""
import argparse
import collections
import gzip
import json
import pathlib
import subprocess
import tempfile

STAGES = ("core sky catalogue counts weights model ensemble chain summary figures mock job app").split()


def counts_in(build):
    """file -> line -> how often it ran, all objects together."""
    counts = collections.defaultdict(lambda: collections.defaultdict(int))
    notes = [str(path.resolve()) for path in (build / "src").rglob("*.gcno")]
    with tempfile.TemporaryDirectory() as folder:
        for start in range(0, len(notes), 50):
            subprocess.run(["gcov", "--json-format", "--hash-filenames", *notes[start:start + 50]], cwd=folder,
                           check=True, stdout=subprocess.DEVNULL, stderr=subprocess.DEVNULL)
        for path in pathlib.Path(folder).glob("*.gcov.json.gz"):
            found = json.loads(gzip.decompress(path.read_bytes()))
            for file in found["files"]:
                name = str((pathlib.Path(found["current_working_directory"]) / file["file"]).resolve())
                for line in file["lines"]:
                    counts[name][line["line_number"]] += line["count"]
    return counts


def stage_of(path, source):
    for place in (source / "src", source / "include" / "deviascope"):
        if path.is_relative_to(place):
            return path.relative_to(place).parts[0]
    return None


def main():
    words = argparse.ArgumentParser()
    words.add_argument("build", type=pathlib.Path)
    words.add_argument("--missing", action="store_true")
    chosen = words.parse_args()
    source = pathlib.Path(__file__).resolve().parent.parent
    lines, run = collections.Counter(), collections.Counter()
    for name, counts in sorted(counts_in(chosen.build).items()):
        path = pathlib.Path(name)
        stage = stage_of(path, source)
        if stage is None:
            continue
        lines[stage] += len(counts)
        run[stage] += sum(count > 0 for count in counts.values())
        missed = sorted(line for line, count in counts.items() if count == 0)
        if chosen.missing and missed:
            print(f"{path.relative_to(source)}: {', '.join(map(str, missed))}")
    print(f"{'stage':<12}{'lines':>8}{'run':>8}{'%':>8}")
    for stage in [*STAGES, "all"]:
        n = lines[stage] if stage != "all" else sum(lines.values())
        n_run = run[stage] if stage != "all" else sum(run.values())
        print(f"{stage:<12}{n:>8}{n_run:>8}{100.0 * n_run / max(n, 1):>8.1f}")


if __name__ == "__main__":
    main()
