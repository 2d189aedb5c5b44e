"""Runs of the program and their times.

A machine in use is noisy: variants that are compared run in turns, and the best
time of each counts. Start-up and compilation of the circuit, measured with one
shot, are taken off.
"""

import json
import pathlib
import subprocess
import time
from dataclasses import dataclass, field

ROOT = pathlib.Path(__file__).resolve().parents[2]
DEMO = ROOT / "demo-data"


class Refused(Exception):
    """The program would not or could not do it, or not in time."""


@dataclass
class Job:
    """A circuit with options, to be run with different numbers of shots."""

    circuit: pathlib.Path
    readout: str = "walk"
    delta: float = 0.1
    options: tuple = ()
    seed: int = 1

    def words(self, shots):
        """Command-line words after `run`."""
        words = [self.circuit, "--shots", shots, "--delta", self.delta, "--seed", self.seed,
                 "--readout", self.readout, *self.options]
        if "--companion" not in self.options:
            words += ["--companion", 0]
        return [str(word) for word in words]


@dataclass
class Timing:
    """Best seconds a shot, of how many shots, and the last summary."""

    seconds: float
    shots: int
    summary: dict = field(repr=False)

    @property
    def rate(self):
        """Shots a second."""
        return 1 / self.seconds


@dataclass
class Bench:
    """The program under measurement, a scratch folder, seconds a measurement and
    repeats of it."""

    program: str
    folder: pathlib.Path
    seconds: float
    repeats: int = 3
    profile: str = "bench"

    def run(self, job, shots, limit=None):
        """(seconds, summary) of one run; at most `limit` seconds."""
        limit = limit or 20 * self.seconds + 60
        command = [self.program, "run", *job.words(shots), "--json", "--force",
                   "--out", str(self.folder / "bench.h5")]
        start = time.perf_counter()
        try:
            result = subprocess.run(command, capture_output=True, text=True, timeout=limit,
                                    check=False)
        except subprocess.TimeoutExpired as error:
            raise Refused(f"more than {limit:.0f} s for {shots} shots") from error
        taken = time.perf_counter() - start
        if result.returncode != 0:
            raise Refused((result.stderr.strip().splitlines() or ["no message"])[0])
        return taken, json.loads(result.stdout)

    def calibrate(self, job):
        """(start-up seconds, shots that take about the time wanted)."""
        start_up, _ = self.run(job, 1)
        shots = 2
        taken, _ = self.run(job, shots)
        while taken - start_up < self.seconds / 4:
            # In steps that bad luck cannot blow up.
            shots *= 8 if taken - start_up < self.seconds / 40 else 2
            taken, _ = self.run(job, shots)
        wanted = int(shots * self.seconds / (taken - start_up))
        return start_up, max(wanted, 2)

    def in_turns(self, jobs, shots=None):
        """A `Timing` for each of the named jobs; `shots` by name, or calibrated."""
        plans = {}
        for name, job in jobs.items():
            if shots is None:
                plans[name] = self.calibrate(job)
            else:
                plans[name] = self.run(job, 1)[0], shots[name]
        best = {name: float("inf") for name in jobs}
        summaries = {}
        for _ in range(self.repeats):
            for name, job in jobs.items():
                start_up, count = plans[name]
                taken, summaries[name] = self.run(job, count)
                best[name] = min(best[name], max(taken - start_up, 1e-9) / (count - 1))
        return {name: Timing(best[name], plans[name][1], summaries[name]) for name in jobs}
