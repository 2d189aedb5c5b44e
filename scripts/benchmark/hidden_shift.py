"""The hidden shift on 40 qubits with eight ccz: right answers against the law.

The answer of the circuit is certain, so the drawn shots are right with
probability (1 − λ) + λ·P_comp(s). P_comp(s), the chance that the companion
circuit finds the shift, is computed here exactly: there every ccz is one of the
eight diagonal Clifford gates D_b(z) = CCZ(z)·CCZ(z⊕b), all equally likely
(Quantum 3, 181 (2019)), and bits that share no cubic term are independent.
"""

import itertools
import math

import line_circuits
import numpy as np

from . import figures
from .timing import DEMO, Job

PART = "hidden-shift"
DELTA = 0.1
SHOTS = 10_000
LIMIT = 600
ASKED_DEVIATION = 4


def blocks(triples):
    """Cubic terms grouped by the bits they share."""
    groups = []
    for triple in triples:
        joined = [triple]
        for group in groups[:]:
            if {bit for other in group for bit in other} & set(triple):
                groups.remove(group)
                joined = group + joined
        groups.append(joined)
    return groups


def component(bits, b):
    """D_b as signs, for arrays of three bits."""
    product = bits[0] & bits[1] & bits[2]
    moved = (bits[0] ^ b[0]) & (bits[1] ^ b[1]) & (bits[2] ^ b[2])
    return 1 - 2 * (product ^ moved)


def walsh(vectors):
    """Hadamard gates on every bit of the last axis."""
    size = vectors.shape[-1]
    step = 1
    while step < size:
        pairs = vectors.reshape(-1, size // (2 * step), 2, step)
        low, high = pairs[:, :, 0], pairs[:, :, 1]
        vectors = np.stack([low + high, low - high], axis=2).reshape(-1, size)
        step *= 2
    return vectors / math.sqrt(size)


def block_success(triples, shift):
    """Chance that the companion finds the shift's bits of one block of cubic
    terms; `shift` holds all bits, u half then v half."""
    bits = sorted({bit for triple in triples for bit in triple})
    place = {bit: index for index, bit in enumerate(bits)}
    width = len(bits)
    z = np.arange(4 ** width)
    u = [z >> i & 1 for i in range(width)]
    v = [z >> width + i & 1 for i in range(width)]
    u_shift = [shift[bit] for bit in bits]
    v_shift = [shift[line_circuits.HALF + bit] for bit in bits]
    pairs = np.zeros_like(z)
    pairs_shifted = np.zeros_like(z)
    for i in range(width):
        pairs ^= u[i] & v[i]
        pairs_shifted ^= (u[i] ^ u_shift[i]) & (v[i] ^ v_shift[i])
    wanted = np.zeros_like(z)
    for i in range(width):
        wanted ^= u[i] * u_shift[i] ^ v[i] * v_shift[i]

    def diagonals(half, offsets, base):
        """The signs for every choice of components, one row each."""
        choices = itertools.product(itertools.product((0, 1), repeat=3), repeat=len(triples))
        rows = []
        for choice in choices:
            signs = 1 - 2 * base
            for triple, b in zip(triples, choice):
                read = [half[place[bit]] ^ offsets[place[bit]] for bit in triple]
                signs = signs * component(read, b)
            rows.append(signs)
        return np.array(rows, dtype=float)

    first = diagonals(u, u_shift, pairs_shifted) / 2 ** width
    second = diagonals(v, [0] * width, pairs)
    between = walsh(first)
    amplitudes = (between * (1 - 2 * wanted)) @ second.T / 2 ** width
    return float((amplitudes ** 2).mean())


def companion_success():
    """P_comp(s) of the whole circuit."""
    shift = line_circuits.hidden_shift()
    return math.prod(block_success(group, shift) for group in blocks(line_circuits.CUBIC))


def measure(bench):
    """Fraction of right answers and how far it is from the law."""
    job = Job(DEMO / "hidden-shift-forty.qasm", "walk", DELTA)
    timing = bench.in_turns({"": job})[""]
    yield figures.Figure(PART, f"walk, delta = {DELTA}, k = {timing.summary['terms']:,}, "
                         "all threads", f"{figures.number(timing.rate)} shots/s",
                         values={"shots_per_second": timing.rate})
    _, summary = bench.run(job, SHOTS, limit=LIMIT)
    mismatch = next(r for r in summary["registers"] if r["name"] == "mismatch")
    right = 1 - mismatch["any_nonzero"]["raw"]["value"]
    share = summary["mixing_weight"]
    law = 1 - share + share * companion_success()
    error = math.sqrt(law * (1 - law) / SHOTS)
    yield figures.at_most(
        PART, f"right answers of {SHOTS:,} against the law {law:.5f}, in standard errors",
        abs(right - law) / error, ASKED_DEVIATION, note=f" (found {right:.5f})",
        right=right, law=law, shots=SHOTS)
