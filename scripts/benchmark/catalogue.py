"""Shots a second of the demo circuits with each read-out, and that idle qubits
and Clifford depth cost a shot nothing."""

from . import figures
from .timing import DEMO, Job, Refused

PART = "circuits"
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
    ("line-noisy-t", None, 0.1),
    ("hidden-shift-forty", None, 0.1),
]
READOUTS = ("auto", "dense", "walk", "probe")

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
    text = (DEMO / "steane-memory.qasm").read_text()
    text = text.replace("qubit[7] data;", "qubit[7] data;\nqubit[1000] idle;", 1)
    lines = text.splitlines(keepends=True)
    place = next(i for i, line in enumerate(lines) if line.startswith("encode "))
    lines.insert(place + 1, PADDING)
    path = folder / "padded.qasm"
    path.write_text("".join(lines))
    return path


def measure(bench):
    """Shots a second."""
    for name, noise, delta in CASES:
        options = ("--noise", DEMO / f"{noise}.toml") if noise else ()
        for readout in READOUTS:
            what = f"{name}, {readout}, delta = {delta}"
            job = Job(DEMO / f"{name}.qasm", readout, delta, options)
            try:
                timing = bench.in_turns({"": job})[""]
            except Refused as error:
                yield figures.refused(PART, what, error)
                continue
            yield row(what, timing)
    yield from padding(bench)


def row(what, timing):
    """One circuit with one read-out."""
    summary = timing.summary
    terms = f"k = {summary['terms']:,}" if summary["terms"] else summary["readout"]
    return figures.Figure(
        PART, what,
        f"{figures.number(timing.rate)} shots/s ({terms}, r = {summary['draws']['peak_active']})",
        values={"shots_per_second": timing.rate, "terms": summary["terms"],
                "readout": summary["readout"]})


def padding(bench):
    """Without noise, so that the padding brings no faults of its own."""
    jobs = {
        "plain": Job(DEMO / "steane-memory.qasm", "dense"),
        "padded": Job(padded_memory(bench.folder), "dense"),
    }
    found = bench.in_turns(jobs)
    ratio = found["padded"].seconds / found["plain"].seconds
    yield figures.Figure(PART, "steane-memory, dense: 1,000 idle qubits and 400,000 gates more",
                         f"{ratio:.3g} times as long a shot", values={"value": ratio})
