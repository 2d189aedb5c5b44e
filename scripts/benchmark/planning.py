"""Predicted against actual time and memory of runs, and the automatic choice.

For every circuit and read-out: plan, run, plan again, a few times over, so that
a machine whose speed drifts is the same for both. The ratio is the median.
"""

import json
import os
import pathlib
import statistics
import subprocess
import sys
import time

from . import figures

PART = "plan"
ROOT = pathlib.Path(__file__).resolve().parents[2]

# Circuit, noise file, δ, read-outs.
CASES = [
    ("five-t", "bench-b-idle", 0.1, ("dense", "walk", "probe")),
    ("ghz-phase", None, 0.1, ("dense", "walk", "probe")),
    ("t-injection", None, 0.1, ("dense", "walk", "probe")),
    ("hidden-shift", None, 0.1, ("dense", "walk", "probe")),
    ("steane-memory", "bench-b", 0.1, ("dense", "walk", "probe")),
    ("steane-seven-t", "bench-b", 0.1, ("dense", "walk", "probe")),
    ("wide-layers", "bench-b-gates", 0.5, ("dense", "walk", "probe")),
    ("wide-layers", "bench-b-gates", 0.02, ("walk",)),
    ("wide-mirror", "bench-b-gates", 0.5, ("dense", "walk", "probe")),
    ("line-forty-t", None, 0.1, ("walk",)),
    ("line-forty-t", None, 0.02, ("walk",)),
    ("line-noisy-t", None, 0.1, ("dense", "walk")),
    ("hidden-shift-forty", None, 0.1, ("dense", "walk")),
]
TIME_LIMIT = 0.25
MEMORY_LIMIT = 0.15
# What a wrong automatic choice may cost, over the better read-out.
AUTO_LIMIT = 1.5
# Runs a command without its output and prints its peak memory in KiB.
WATCH = """
import os, sys
quiet = [(os.POSIX_SPAWN_OPEN, 1, os.devnull, os.O_WRONLY, 0)]
child = os.posix_spawn(sys.argv[1], sys.argv[1:], os.environ, file_actions=quiet)
_, status, usage = os.wait4(child, 0)
print(usage.ru_maxrss)
sys.exit(os.waitstatus_to_exitcode(status))
"""


def arguments(case):
    """Circuit and noise as command-line words."""
    circuit, noise = case[:2]
    path = pathlib.Path(circuit)
    words = [str(path if path.suffix else ROOT / "demo-data" / f"{circuit}.qasm")]
    if noise:
        words += ["--noise", str(ROOT / "demo-data" / f"{noise}.toml")]
    return words


def plan(program, case, readout, shots):
    """The estimate of one read-out, and how long planning took."""
    start = time.perf_counter()
    shown = subprocess.run([program, "plan", *arguments(case), "--shots", str(shots),
                            "--delta", str(case[2]), "--readout", readout, "--json"],
                           capture_output=True, text=True, check=True, timeout=120)
    seconds = time.perf_counter() - start
    document = json.loads(shown.stdout)
    row = document["dense"] if readout == "dense" else document["rows"][0][readout]
    if row["refused"]:
        raise RuntimeError(row["refused"])
    return row, seconds


def run(program, case, readout, shots, folder):
    """Seconds and peak memory in bytes of a run."""
    command = [program, "run", *arguments(case), "--shots", str(shots),
               "--delta", str(case[2]), "--readout", readout, "--seed", "1",
               "--out", str(pathlib.Path(folder) / "plan.h5"), "--force"]
    # A small process starts the program and waits for it: the peak memory of a
    # child counts from that of whoever started it.
    start = time.perf_counter()
    result = subprocess.run([sys.executable, "-S", "-E", "-c", WATCH, *command],
                            capture_output=True, text=True, check=False)
    seconds = time.perf_counter() - start
    if result.returncode != 0:
        raise RuntimeError(result.stderr.strip())
    return seconds, int(result.stdout.split()[-1]) * 1024


def check(program, case, readout, seconds, repeats, folder):
    """Plans and runs one case; `seconds` is about what a run should take."""
    shots = 1000
    for _ in range(3):
        row, _ = plan(program, case, readout, shots)
        factor = min(seconds / max(row["seconds"], 1e-9), 100)
        shots = max(2, int(shots * factor))
    ratios, memories, planning = [], [], []
    for _ in range(repeats):
        before, took = plan(program, case, readout, shots)
        actual, memory = run(program, case, readout, shots, folder)
        after, _ = plan(program, case, readout, shots)
        predicted = (before["seconds"] * after["seconds"]) ** 0.5
        ratios.append(predicted / actual)
        memories.append(before["memory_bytes"] / memory)
        planning.append(took)
    return {"shots": shots, "terms": row["terms"], "seconds": actual, "memory": memory,
            "time_ratio": statistics.median(ratios), "ratios": ratios,
            "memory_ratio": statistics.median(memories), "planning": max(planning)}


def choose(program, case, seconds, repeats, folder):
    """Time of `auto` over that of the better of dense and walk, as a median."""
    better = min((plan(program, case, readout, 1000)[0]["seconds_a_shot"]
                  for readout in ("dense", "walk")), default=1e-3)
    shots = max(2, int(seconds / better))
    ratios = []
    for _ in range(repeats):
        taken = {}
        for readout in ("dense", "auto", "walk"):
            # What is hopelessly slow is not the better one.
            limit = 20 * seconds
            estimate = plan(program, case, readout, shots)[0] if readout != "auto" else None
            if estimate and estimate["seconds"] > limit:
                continue
            taken[readout] = run(program, case, readout, shots, folder)[0]
        best = min(value for readout, value in taken.items() if readout != "auto")
        ratios.append(taken["auto"] / best)
    return {"shots": shots, "ratio": statistics.median(ratios), "ratios": ratios, "taken": taken}


def off_by(ratio):
    """By how much of itself a ratio misses 1."""
    return abs(ratio - 1)


def measure(bench):
    """Predicted over actual time and memory of every case."""
    for case in CASES:
        for readout in case[3]:
            what = f"{case[0]}, {readout}, delta = {case[2]}: predicted / actual"
            try:
                found = check(bench.program, case, readout, bench.seconds, 1, bench.folder)
            except (RuntimeError, subprocess.SubprocessError) as error:
                yield figures.refused(PART, what, error, "to run")
                continue
            time_ratio, memory_ratio = found["time_ratio"], found["memory_ratio"]
            yield figures.Figure(
                PART, f"{what} time", f"{time_ratio:.2f} ({found['seconds']:.2f} s, "
                f"planned in {found['planning']:.1f} s)", f"1 +- {TIME_LIMIT}",
                off_by(time_ratio) <= TIME_LIMIT, {"ratio": time_ratio})
            yield figures.Figure(
                PART, f"{what} memory", f"{memory_ratio:.2f} ({found['memory'] / 2**20:.0f} MiB)",
                f"1 +- {MEMORY_LIMIT}", off_by(memory_ratio) <= MEMORY_LIMIT,
                {"ratio": memory_ratio})


def automatic(bench):
    """What the automatic choice costs over the better read-out."""
    seen = set()
    for case in CASES:
        if case[:3] in seen:
            continue
        seen.add(case[:3])
        what = f"{case[0]}, delta = {case[2]}: auto / better of dense and walk"
        try:
            found = choose(bench.program, case, bench.seconds, 1, bench.folder)
        except (RuntimeError, subprocess.SubprocessError) as error:
            yield figures.refused("auto", what, error, "to run")
            continue
        taken = ", ".join(f"{name} {value:.2f} s" for name, value in found["taken"].items())
        yield figures.at_most("auto", what, found["ratio"], AUTO_LIMIT, note=f" ({taken})")
