"""The long line: 50 qubits, 40 noisy t, read out by `walk`.

Shots a second, against `probe` at the same δ, with one thread and two, and how
the time of a shot grows with the number of terms k.
"""

from . import figures
from .timing import DEMO, Job, Refused

PART = "line-forty-t"
CIRCUIT = DEMO / "line-forty-t.qasm"
DELTA = 0.1
ASKED_RATE = 100
ASKED_RATIO = 500
ASKED_THREADS = 1.85
ASKED_LINEAR = 0.15
PROBE_SHOTS = 2
PROBE_LIMIT = 120
# Terms, and shots that make a run of a second or more at a few µs a term.
SCALING = {1_000: 400, 10_000: 40, 100_000: 6, 1_000_000: 3}
# Batches from which the cost of one more attempt to draw is had.
BATCHES = 30
BATCH_TERMS = 1_000
BATCH_SHOTS = 20


def job(readout="walk", terms=None, threads=None, seed=1):
    """The long line with options."""
    options = ()
    if terms is not None:
        options += ("--terms", terms)
    if threads is not None:
        options += ("--threads", threads)
    return Job(CIRCUIT, readout, DELTA, options, seed)


def measure(bench):
    """Rate, threads, probe."""
    found = bench.in_turns({2: job(threads=2), 1: job(threads=1)})
    two, one = found[2], found[1]
    terms = two.summary["terms"]
    yield figures.at_least(PART, f"walk, delta = {DELTA}, k = {terms:,}, 2 threads", two.rate,
                           ASKED_RATE, " shots/s", shots=two.shots)
    gain = one.seconds / two.seconds
    yield figures.at_least(PART, "walk, 2 threads / 1 thread", gain, ASKED_THREADS,
                           note=f" ({two.rate:.3g} / {one.rate:.3g} shots/s)")
    yield against_probe(bench, two.rate)


def against_probe(bench, rate):
    """The ratio to `probe`, or a lower bound of it."""
    what = f"walk / probe, delta = {DELTA}, 2 threads"
    try:
        taken, summary = bench.run(job("probe", threads=2), PROBE_SHOTS, PROBE_LIMIT)
    except Refused as error:
        bound = rate * PROBE_LIMIT / PROBE_SHOTS
        note = f" at least (probe: {error})"
        return figures.at_least(PART, what, bound, ASKED_RATIO, note=note)
    note = f" (probe {taken / PROBE_SHOTS:.3g} s a shot, k = {summary['terms']:,})"
    return figures.at_least(PART, what, rate * taken / PROBE_SHOTS, ASKED_RATIO, note=note)


def scaling(bench):
    """Time of a shot over k. Few terms are drawn anew more often, by the law of
    the drawn shots and not by the code; the cost of these attempts is measured
    on its own and taken off."""
    jobs = {terms: job(terms=terms, threads=1) for terms in SCALING}
    found = bench.in_turns(jobs, SCALING)
    attempt = cost_of_an_attempt(bench)
    yield figures.Figure("k-scaling", "one more attempt to draw, a term, 1 thread",
                         f"{attempt * 1e9:.3g} ns", values={"nanoseconds": attempt * 1e9})
    times = {}
    for terms, timing in found.items():
        attempts = timing.summary["draws"]["mean_attempts"]
        whole = timing.seconds / terms
        times[terms] = whole - (attempts - 1) * attempt
        yield figures.Figure(
            "k-scaling", f"walk, k = {terms:,}: time of a shot / k, 1 thread",
            f"{times[terms] * 1e6:.3g} us ({whole * 1e6:.3g} us at {attempts:.2f} attempts)",
            values={"terms": terms, "seconds": timing.seconds, "attempts": attempts})
    middle = sum(times.values()) / len(times)
    worst = max(abs(value / middle - 1) for value in times.values())
    yield figures.at_most("k-scaling", "largest deviation from linear, k = 1,000 ... 1,000,000",
                          100 * worst, 100 * ASKED_LINEAR, " %")


def cost_of_an_attempt(bench):
    """Seconds a term of one more attempt: batches of shots differ in their mean
    number of attempts; the slope of their times over it, by least squares."""
    points = []
    for seed in range(BATCHES):
        batch = job(terms=BATCH_TERMS, threads=1, seed=seed)
        runs = [bench.run(batch, BATCH_SHOTS) for _ in range(bench.repeats)]
        attempts = runs[0][1]["draws"]["mean_attempts"]
        points.append((attempts, min(taken for taken, _ in runs) / BATCH_SHOTS))
    mean_x = sum(x for x, _ in points) / BATCHES
    mean_y = sum(y for _, y in points) / BATCHES
    spread = sum((x - mean_x) ** 2 for x, _ in points)
    slope = sum((x - mean_x) * (y - mean_y) for x, y in points) / spread
    return max(slope, 0.0) / BATCH_TERMS
