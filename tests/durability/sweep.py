# SPDX-License-Identifier: GPL-2.0-or-later
"""Kills a run at every call by which it changes a file, or lets that call fail, and holds what is
left against what was reported as stored and against an uninterrupted run.

    sweep.py SUBJECT PROGRAM FAULTS WHAT [--points N] [--expect-damage]

SUBJECT  `chain`: `deviascope sample` on a small job; `results`: `deviascope run`, with summary,
         figures, tables and sky files; `in-place`: in_place_writer.cpp
PROGRAM  its path
FAULTS   the library to preload (write_faults.c)
WHAT     kill, kill-resume, fail, no-exchange, reader

With --points, about so many calls are tried, evenly spaced; which ones follows from the bytes of
the program, so that they rotate as it changes and stay while it does not. Files are read with
h5py, which knows nothing of the program, in a process of its own. Ends with 0 where nothing was
lost (with --expect-damage: where something was); the last line gives the score.
"""
import argparse
import errno
import hashlib
import json
import os
import pathlib
import re
import shutil
import signal
import subprocess
import sys
import tempfile
import time

import h5py
import numpy

SECONDS_A_RUN = 600  # far beyond what a run takes; a machine may be busy
JOB = """[job]
seed = 20260817
nside = 4
frame = "icrs"
[velocity]
prior = { kind = "gaussian", sd = 0.05 }
[intrinsic]
prior = "no-intrinsic"
[ensemble]
replicates = 2
walkers = 96
store_every = 2
max_steps = 512
effective_draws = 1e9
[[survey]]
name = "binnacle"
catalogue = "binnacle.csv"
frame = "icrs"
columns = { lon = "ra", lat = "dec", flux = "s" }
[[survey.bin]]
name = "faint"
select = { flux = [1.0, 2.0] }
weight = { mean = 3.75, sd = 0.0 }
[[survey.bin]]
name = "bright"
select = { flux = [2.0, inf] }
weight = { mean = 6.0, sd = 0.0 }
"""
# Times of day, and what depends on where the run was cut: one row a block.
DIFFERING = re.compile(r"/job@(started|ended)|/state/|/kernel_tally/(tried|taken)|/evaluations/times")


def catalogue(n_rows):
    """Positions on a lattice of golden-ratio steps."""
    number = numpy.arange(n_rows)
    lon = 360.0 * ((number * 0.6180339887498949) % 1.0)
    lat = numpy.degrees(numpy.arcsin((2.0 * number + 1.0) / n_rows - 1.0))
    rows = (f"{a:.6f},{b:.6f},{1.5 if k % 2 == 0 else 3.0}" for k, a, b in zip(number, lon, lat))
    return "ra,dec,s\n" + "\n".join(rows) + "\n"


def files_in(folder):
    """The files of a folder and of its folders, by their paths in it."""
    return sorted(str(path.relative_to(folder)) for path in folder.rglob("*") if path.is_file())


class Subject:
    """A program under test: how it is run, and what its folder should hold in the end."""

    COMMANDS = {"chain": "sample", "results": "run"}

    def __init__(self, name, program, faults, job):
        self.command = self.COMMANDS.get(name)
        self.program, self.faults, self.job = program, faults, job

    def run(self, folder, resume=False, threads=1, **faults):
        words = [self.program]
        if self.command:
            words += [self.command, self.job, "-o", str(folder), "--rows-per-block", "9"]
            words += ["--threads", str(threads)]
        else:
            words += [str(folder)]
        words += ["--resume"] * resume
        surroundings = dict(os.environ, OMP_NUM_THREADS=str(threads))
        if faults:
            surroundings["LD_PRELOAD"] = self.faults
            surroundings.update({f"FAULT_{name.upper()}": str(value) for name, value in faults.items()})
        return subprocess.run(words, env=surroundings, capture_output=True, text=True,
                              timeout=SECONDS_A_RUN)

    def calls(self, folder, resume=False, **faults):
        """The calls of a run in which nothing goes wrong, by name."""
        log = pathlib.Path(str(folder) + ".log")
        log.unlink(missing_ok=True)
        result = self.run(folder, resume, log=log, **faults)
        assert result.returncode == 0, result.stderr
        return [line.split()[1] for line in log.read_text().splitlines()]


def acknowledged(result):
    return sum(int(n) for n in re.findall(r"^Stored (\d+) rows", result.stdout, re.MULTILINE))


# ---- reading, in a process of its own ----

def content(path):
    """Every dataset and attribute, but those that may differ."""
    found = {}

    def add(name, thing):
        for key, value in thing.attrs.items():
            found[f"{name}@{key}"] = repr(value)
        if isinstance(thing, h5py.Dataset):
            found[name] = (thing.dtype.str, thing.shape, thing[()].tobytes())

    with h5py.File(path, "r") as file:
        add("/", file)
        file.visititems(lambda name, thing: add("/" + name, thing))
        if "/state/rows" in file:
            found["state"] = tuple(
                file[place][-1].tobytes() for place in
                ("/state/step", "/state/look", "/state/rows", "/state/coordinates",
                 "/state/log_posterior", "/kernel_tally/tried", "/kernel_tally/taken",
                 "/evaluations/times"))
    return {place: value for place, value in found.items() if not DIFFERING.match(place)}


def fault_of_rows(path, reference, n_acknowledged):
    """What is wrong with the stored rows, or nothing."""
    with h5py.File(path, "r") as file:
        n_rows = file["draws"].shape[0] if "draws" in file else 0
        if n_rows < n_acknowledged:
            return f"{n_rows} rows where {n_acknowledged} were reported"
        for name in ("draws", "log_posterior", "log_likelihood"):
            if name not in reference or n_rows == 0:
                continue
            if file[name].shape[0] != n_rows:
                return f"{name} has {file[name].shape[0]} rows, draws {n_rows}"
            if file[name][:].tobytes() != reference[name][:n_rows].tobytes():
                return f"other values in {name}"
        if n_rows and "state" in file and file["state/rows"][-1] != n_rows:
            return "the state is not that of the rows"
    return ""


def apart(question, *arguments):
    """The answer of a function, from a child process: reading may crash or hang."""
    receiver, sender = os.pipe()
    child = os.fork()
    if child == 0:
        signal.alarm(20)
        try:
            answer = question(*arguments)
        except Exception as error:  # whatever the reader makes of a damaged file
            answer = f"cannot be read: {error}"
        os.write(sender, json.dumps(answer).encode())
        os._exit(0)
    os.close(sender)
    with os.fdopen(receiver, "rb") as stream:
        answer = stream.read()
    _, status = os.waitpid(child, 0)
    return json.loads(answer) if answer else f"the reader ended with status {status}"


class Reference:
    """An uninterrupted run."""

    def __init__(self, subject, folder):
        self.calls = subject.calls(folder)
        self.files = files_in(folder)
        self.content = content(folder / "chains.h5")
        self.rows = {}
        with h5py.File(folder / "chains.h5", "r") as file:
            for name in ("draws", "log_posterior", "log_likelihood"):
                if name in file:
                    self.rows[name] = file[name][:]
        self.others = {name: (folder / name).read_bytes() for name in self.files
                       if name != "chains.h5"}

    def fault_of_part(self, folder, n_acknowledged):
        """What is wrong with a folder whose run was cut off."""
        for name in self.others:
            if (folder / name).exists() and (folder / name).read_bytes() != self.others[name]:
                return f"other bytes in {name}"
        path = folder / "chains.h5"
        if not path.exists():
            return f"no file where {n_acknowledged} rows were reported" if n_acknowledged else ""
        return apart(fault_of_rows, str(path), self.rows, n_acknowledged)

    def fault_of_whole(self, folder):
        """What is wrong with a folder whose run has come to its end."""
        names = files_in(folder)
        if names != self.files:
            return f"the folder holds {names}"
        for name, expected in self.others.items():
            if (folder / name).read_bytes() != expected:
                return f"other bytes in {name}"
        return apart(self.fault_of_content, str(folder / "chains.h5"))

    def fault_of_content(self, path):
        found = content(path)
        differing = [place for place in sorted(found.keys() | self.content.keys())
                     if found.get(place) != self.content.get(place)]
        return f"differing: {', '.join(differing[:5])}" if differing else ""


class Score:
    def __init__(self):
        self.points = self.survived = self.resumed = 0
        self.faults = []

    def add(self, place, after, resumed):
        self.points += 1
        self.survived += not after
        self.resumed += not after and not resumed
        if after or resumed:
            self.faults.append(f"{place}: {after or 'after --resume: ' + resumed}")

    def tell(self, what):
        for fault in self.faults[:40]:
            print(fault)
        print(f"{what}: {self.survived} of {self.points} points survived, "
              f"{self.resumed} ended as an uninterrupted run")
        return 0 if self.points and self.resumed == self.points else 1


class Sweep:
    def __init__(self, subject, folder, n_points):
        self.subject, self.folder, self.n_points = subject, folder, n_points
        self.reference = Reference(subject, self.fresh("reference"))
        self.place = self.fresh("point")
        self.score = Score()

    def fresh(self, name, copy_of=None):
        path = self.folder / name
        shutil.rmtree(path, ignore_errors=True)
        shutil.copytree(copy_of, path) if copy_of else path.mkdir()
        return path

    def chosen(self, n_calls):
        stride = max(1, n_calls // self.n_points) if self.n_points else 1
        digest = hashlib.sha256(pathlib.Path(self.subject.program).read_bytes()).digest()
        return range(1 + int.from_bytes(digest[:4], "big") % stride, n_calls + 1, stride)

    def end_of(self, number):
        """What is wrong after going on, on another number of threads."""
        result = self.subject.run(self.place, resume=True, threads=1 + number % 3)
        if result.returncode != 0:
            return f"exit code {result.returncode}: {result.stderr.strip()}"
        return self.reference.fault_of_whole(self.place)

    def kill(self):
        """Every call of a run, killed before it and half-way through it."""
        for number in self.chosen(len(self.reference.calls)):
            for mode in ("before", "half"):
                self.place = self.fresh("point")
                self.point(number, mode, 0, resume=False)

    def point(self, number, mode, n_before, resume):
        result = self.subject.run(self.place, resume=resume, at=number, mode=mode)
        after = "" if result.returncode == -signal.SIGKILL else "the run was not killed"
        after = after or self.reference.fault_of_part(self.place,
                                                      n_before + acknowledged(result))
        self.score.add(f"killed {mode} call {number}", after, self.end_of(number))

    def kill_resume(self):
        """The same for runs that go on: from the middle, from near the end, from a warm-up."""
        n_calls = len(self.reference.calls)
        begun = self.reference.calls.index("rename") + 1
        for cut in (n_calls // 2, n_calls - 12, n_calls // 8, begun):
            base = self.fresh("base")
            first = self.subject.run(base, at=cut, mode="half")
            calls = self.subject.calls(self.fresh("whole", copy_of=base), resume=True)
            for number in self.chosen(len(calls)):
                for mode in ("before", "half"):
                    self.place = self.fresh("point", copy_of=base)
                    self.point(number, mode, acknowledged(first), resume=True)

    def fail(self):
        """Every call refused, once or from then on."""
        for number in self.chosen(len(self.reference.calls)):
            for mode, reason in (("once", errno.ENOSPC), ("once", errno.EIO),
                                 ("from", errno.ENOSPC)):
                self.place = self.fresh("point")
                result = self.subject.run(self.place, at=number, mode=mode, errno=reason)
                after = self.fault_of_failure(result)
                after = after or self.reference.fault_of_part(self.place, acknowledged(result))
                call = self.reference.calls[number - 1]
                self.score.add(f"{mode} {os.strerror(reason)} at call {number} ({call})", after,
                               self.end_of(number))

    def fault_of_failure(self, result):
        """Only the removal of what is left over may fail without a word."""
        if result.returncode == 0:
            return self.reference.fault_of_part(self.place, len(self.reference.rows["draws"]))
        if result.returncode != 5:
            return f"exit code {result.returncode}: {result.stderr.strip()}"
        lines = [line for line in result.stderr.splitlines() if not line.startswith("Warning: ")]
        if len(lines) != 1 or not lines[0].startswith("deviascope: "):
            return f"not one message: {lines}"
        n_rows = acknowledged(result)
        if n_rows and "--resume" not in lines[0]:
            return f"a message without the remedy: {lines[0]}"
        return ""

    def no_exchange(self):
        """Kills where the file system cannot exchange two names."""
        calls = self.subject.calls(self.fresh("reference"), no_exchange=1)
        for number in self.chosen(len(calls)):
            self.place = self.fresh("point")
            result = self.subject.run(self.place, at=number, mode="before", no_exchange=1)
            after = self.reference.fault_of_part(self.place, acknowledged(result))
            self.score.add(f"without exchange, killed before call {number}", after,
                           self.end_of(number))

    def reader(self):
        """Opens the chain over and over while it grows; every state must be complete."""
        place = self.fresh("point")
        process = subprocess.Popen([self.subject.program, self.subject.command,
                                    self.subject.job, "-o", str(place), "--rows-per-block", "1",
                                    "--quiet"])
        refused = 0
        while process.poll() is None:
            try:
                fault = fault_of_rows(place / "chains.h5", self.reference.rows, 0)
                self.score.add("a reader beside the run", fault, "")
            except FileNotFoundError:
                time.sleep(0.001)
            except OSError as error:
                refused += 1
                if "unable to lock" not in str(error):
                    self.score.add("a reader beside the run", str(error), "")
        print(f"{refused} times locked for an instant")
        self.score.add("the run read from", "", self.reference.fault_of_whole(place))


def main():
    words = argparse.ArgumentParser()
    words.add_argument("subject", choices=("chain", "results", "in-place"))
    words.add_argument("program")
    words.add_argument("faults")
    words.add_argument("what", choices=("kill", "kill-resume", "fail", "no-exchange", "reader"))
    words.add_argument("--points", type=int, default=0)
    words.add_argument("--expect-damage", action="store_true")
    chosen = words.parse_args()
    with tempfile.TemporaryDirectory(prefix="deviascope-sweep-") as name:
        folder = pathlib.Path(name)
        (folder / "binnacle.csv").write_text(catalogue(2000))
        (folder / "binnacle.toml").write_text(JOB)
        subject = Subject(chosen.subject, chosen.program, chosen.faults,
                          str(folder / "binnacle.toml"))
        sweep = Sweep(subject, folder, chosen.points)
        getattr(sweep, chosen.what.replace("-", "_"))()
        print(f"{len(sweep.reference.calls)} calls in an uninterrupted run")
        lost = sweep.score.tell(f"{chosen.subject} {chosen.what}")
        return 1 - lost if chosen.expect_damage else lost


if __name__ == "__main__":
    sys.exit(main())
