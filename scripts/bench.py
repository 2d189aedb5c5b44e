"""Shots a second of the demo circuits with each read-out, as a table.

Shots are drawn in growing numbers until a run takes long enough; start-up and
compilation of the circuit, measured with one shot, are taken off.
"""

import argparse
import json
import pathlib
import subprocess
import tempfile
import time

ROOT = pathlib.Path(__file__).resolve().parents[1]

# Circuit, noise file, δ. The wide ones carry the largest extents.
CASES = [
    ("five-t", "bench-b-idle", 0.1),
    ("ghz-phase", None, 0.1),
    ("t-injection", None, 0.1),
    ("hidden-shift", None, 0.1),
    ("steane-memory", "bench-b", 0.1),
    ("steane-seven-t", "bench-b", 0.1),
    ("wide-layers", "bench-b-gates", 0.5),
    ("wide-mirror", "bench-b-gates", 0.5),
]
READOUTS = ("dense", "walk", "probe")


# What the cost of a shot must not depend on: Clifford gates that undo each
# other on the block, and idle qubits with Clifford gates of their own.
PADDING = """for int layer in [1:200] {
  h data; h data; s data; sdg data;
  cx data[0], data[1]; cx data[0], data[1];
  h idle;
  cx idle[0:998], idle[1:999];
}
"""


def padded_memory(folder):
    """The Steane memory circuit with 1,000 idle qubits and 400,000 more gates."""
    text = (ROOT / "demo-data" / "steane-memory.qasm").read_text()
    text = text.replace("qubit[7] data;", "qubit[7] data;\nqubit[1000] idle;", 1)
    lines = text.splitlines(keepends=True)
    place = next(i for i, line in enumerate(lines) if line.startswith("encode "))
    lines.insert(place + 1, PADDING)
    path = folder / "padded.qasm"
    path.write_text("".join(lines))
    return path


class Refused(Exception):
    """The program would not or could not do it."""


def run(program, case, readout, shots, folder, limit):
    """Seconds a run takes, and its summary."""
    circuit, noise, delta = case
    source = ROOT / "demo-data" / f"{circuit}.qasm"
    if circuit == "padded":
        source = padded_memory(folder)
    command = [program, "run", source,
               "--shots", shots, "--delta", delta, "--seed", 1, "--companion", 0,
               "--readout", readout, "--out", folder / "bench.h5",
               "--force", "--quiet"]
    if noise:
        command += ["--noise", ROOT / "demo-data" / f"{noise}.toml"]
    start = time.perf_counter()
    try:
        result = subprocess.run([str(word) for word in command], capture_output=True,
                                text=True, timeout=limit)
    except subprocess.TimeoutExpired as error:
        raise Refused(f"more than {limit:.0f} s for {shots} shots") from error
    seconds = time.perf_counter() - start
    if result.returncode != 0:
        raise Refused((result.stderr.strip().splitlines() or ["no message"])[0])
    shown = subprocess.run([program, "show", str(folder / "bench.h5"), "--json"],
                           capture_output=True, text=True, check=True)
    return seconds, json.loads(shown.stdout)


def measure(program, case, readout, seconds, folder):
    """Shots a second, and the summary of the last run."""
    limit = 20 * seconds
    start_up, _ = run(program, case, readout, 1, folder, limit)
    shots = 16
    while True:
        total, summary = run(program, case, readout, shots, folder, limit)
        if total - start_up > seconds / 2:
            return shots / (total - start_up), summary
        # Towards the full time, but in steps that bad luck cannot blow up.
        shots *= min(max(int(seconds / max(total - start_up, 1e-3)), 2), 16)


def rate(value):
    """A rate in few digits."""
    return f"{value:,.0f}" if value >= 100 else f"{value:.3g}"


def main():
    parser = argparse.ArgumentParser(description=__doc__)
    parser.add_argument("--program", required=True)
    parser.add_argument("--seconds", type=float, default=5.0)
    options = parser.parse_args()
    program = str(pathlib.Path(options.program).resolve())
    print(f"{'circuit':<16}{'qubits':>7}{'extent':>10}{'delta':>7}"
          f"{'read-out':>10}{'terms':>8}{'active':>8}{'shots/s':>12}")
    with tempfile.TemporaryDirectory() as folder:
        # Without noise, so that the padding brings no faults of its own.
        pairs = [(case, readout) for case in CASES for readout in READOUTS]
        pairs += [((name, None, 0.1), "dense") for name in ("steane-memory", "padded")]
        for case, readout in pairs:
            try:
                speed, summary = measure(program, case, readout, options.seconds,
                                         pathlib.Path(folder))
            except Refused as error:
                print(f"{case[0]:<16}{'':>24}{readout:>10}  {error}")
                continue
            extent = 10 ** min(summary["sites"]["log10_extent"], 300)
            terms = summary["terms"] or "-"
            print(f"{case[0]:<16}{summary['qubits']:>7}{extent:>10.4g}{case[2]:>7}"
                  f"{readout:>10}{terms:>8}{summary['draws']['peak_active']:>8}"
                  f"{rate(speed):>12}", flush=True)


if __name__ == "__main__":
    main()
