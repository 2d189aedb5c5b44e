"""Predicted against actual time and memory of runs, as a table.

For every demo circuit and read-out: plan, run, plan again, a few times over, so
that a machine whose speed drifts is the same for both. The ratio is the median.
Exit status 1 if a time is off by more than 25 % or a memory by more than 15 %.
`check` does one case and can be called from elsewhere.
"""

import argparse
import json
import os
import pathlib
import statistics
import subprocess
import sys
import tempfile
import time

ROOT = pathlib.Path(__file__).resolve().parents[1]

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
    start = time.perf_counter()
    process = subprocess.Popen(command, stdout=subprocess.DEVNULL, stderr=subprocess.PIPE)
    # The only way to the peak memory of one child; the pipe holds a short message.
    _, status, usage = os.wait4(process.pid, 0)
    seconds = time.perf_counter() - start
    message = process.stderr.read().decode()
    process.stderr.close()
    process.returncode = os.waitstatus_to_exitcode(status)
    if process.returncode != 0:
        raise RuntimeError(message.strip())
    return seconds, usage.ru_maxrss * 1024


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


def main_auto(program, cases, options):
    """Prints what `auto` costs over the better read-out."""
    bad = 0
    print(f"{'circuit':<16}{'delta':>6}{'shots':>9}{'auto/best':>10}   seconds, last repeat")
    with tempfile.TemporaryDirectory() as folder:
        for case in cases:
            found = choose(program, case, options.seconds, options.repeats, folder)
            off = found["ratio"] > AUTO_LIMIT
            bad += off
            seconds = ", ".join(f"{name} {value:.2f}" for name, value in found["taken"].items())
            print(f"{pathlib.Path(case[0]).stem:<16}{case[2]:>6}{found['shots']:>9}"
                  f"{found['ratio']:>10.2f}   {seconds}{'  OFF' if off else ''}", flush=True)
    print(f"{bad} choices cost more than {AUTO_LIMIT} times the better read-out")
    sys.exit(1 if bad else 0)


def main():
    parser = argparse.ArgumentParser(description=__doc__)
    parser.add_argument("--program", required=True)
    parser.add_argument("--seconds", type=float, default=4.0, help="time of one run")
    parser.add_argument("--repeats", type=int, default=3)
    parser.add_argument("--case", action="append", default=[],
                        help="CIRCUIT.qasm[:READOUT[:DELTA]] besides the demo circuits")
    parser.add_argument("--auto", action="store_true",
                        help="check the automatic choice of the read-out instead")
    parser.add_argument("--only", action="store_true", help="without the demo circuits")
    options = parser.parse_args()
    program = str(pathlib.Path(options.program).resolve())
    cases = [] if options.only else list(CASES)
    for word in options.case:
        circuit, readout, delta = (word.split(":") + ["walk", "0.1"][word.count(":"):])[:3]
        cases.append((circuit, None, float(delta), (readout,)))
    if options.auto:
        main_auto(program, cases, options)
    print(f"{'circuit':<16}{'delta':>6}{'read-out':>9}{'terms':>8}{'shots':>9}{'actual s':>9}"
          f"{'time':>7}{'MiB':>7}{'memory':>8}{'plan s':>7}   predicted/actual")
    bad = 0
    with tempfile.TemporaryDirectory() as folder:
        for case in cases:
            for readout in case[3]:
                try:
                    found = check(program, case, readout, options.seconds, options.repeats, folder)
                except RuntimeError as error:
                    print(f"{case[0]:<16}{case[2]:>6}{readout:>9}  {error}")
                    continue
                off = (abs(found["time_ratio"] - 1) > TIME_LIMIT
                       or abs(found["memory_ratio"] - 1) > MEMORY_LIMIT)
                bad += off
                spread = " ".join(f"{ratio:.2f}" for ratio in found["ratios"])
                print(f"{pathlib.Path(case[0]).stem:<16}{case[2]:>6}{readout:>9}"
                      f"{found['terms'] or '-':>8}{found['shots']:>9}{found['seconds']:>9.2f}"
                      f"{found['time_ratio']:>7.2f}{found['memory'] / 2**20:>7.0f}"
                      f"{found['memory_ratio']:>8.2f}{found['planning']:>7.1f}   {spread}"
                      f"{'  OFF' if off else ''}", flush=True)
    print(f"{bad} off by more than {TIME_LIMIT:.0%} in time or {MEMORY_LIMIT:.0%} in memory")
    sys.exit(1 if bad else 0)


if __name__ == "__main__":
    main()
