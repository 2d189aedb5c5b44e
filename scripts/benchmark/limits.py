"""What the machine allows, and one primitive on one term next to it.

The figures come from `cargo bench --bench limits`, one JSON object a line.
"""

import json
import subprocess

from . import figures
from .timing import ROOT, Refused

PART = "limits"
ASKED_RATIO = 3
ASKED_BYTES = 1.2 * 1024


def lines(profile):
    """The objects that the Rust benchmark prints."""
    command = ["cargo", "bench", "--locked", "--profile", profile, "--bench", "limits"]
    result = subprocess.run(command, cwd=ROOT, capture_output=True, text=True, check=False)
    if result.returncode != 0:
        raise Refused(result.stderr.strip().splitlines()[-1])
    return [json.loads(line) for line in result.stdout.splitlines() if line.startswith("{")]


def measure(bench):
    """Machine limits, then the primitive as a multiple of them."""
    found = lines(bench.profile)
    copies = {line["threads"]: line for line in found if line["figure"] == "copy"}
    for threads, line in copies.items():
        rate = line["bytes_per_second"]
        yield figures.Figure(PART, f"memory, read + write, {threads} thread(s)",
                             f"{rate / 1e9:.3g} GB/s", values=line)
    for line in found:
        if line["figure"] == "count_ones":
            yield figures.Figure(PART, "count_ones of 64-bit words, 1 thread",
                                 f"{line['words_per_second'] / 1e9:.3g} G/s", values=line)
    memory_rate = copies[1]["bytes_per_second"]
    for line in found:
        if line["figure"] == "primitive":
            yield from primitive(line, memory_rate)


def primitive(line, memory_rate):
    """One primitive on one term; bytes of a term."""
    slots, terms = line["slots"], line["terms"]
    once = 2 * line["bytes_per_term"] / memory_rate * 1e9
    ratio = line["nanoseconds"] / once
    what = f"primitive on a term / term's bytes in and out once, r = {slots}, k = {terms:,}"
    note = f" ({line['nanoseconds']:.3g} ns / {once:.3g} ns)"
    if slots == 40:
        yield figures.at_most(PART, what, ratio, ASKED_RATIO, note=note, **line)
    else:
        yield figures.Figure(PART, what, f"{ratio:.3g}{note}",
                             values={"value": ratio, **line})
    if terms >= 100_000:
        yield figures.at_most(PART, f"bytes a term, r = {slots}", line["bytes_per_term"],
                              ASKED_BYTES, slots=slots)
