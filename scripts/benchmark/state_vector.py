"""A plain numpy state vector of the noisy line circuits, to compare with.

One shot draws its faults, runs every gate on 2^n complex64 amplitudes and draws
one outcome. Neighbouring one-qubit gates are multiplied first; that is all the
cleverness there is. Faults are those of the circuit file: Z after a t, one of
the fifteen two-qubit Paulis after a cx.
"""

import math
import time

import line_circuits
import numpy as np

from . import figures
from .timing import Job, Refused

PART = "state-vector"
DELTA = 0.1
T_COUNTS = (8, 16, 24, 32, 64)
PLAIN_T = 24

PAULIS = {
    "i": np.eye(2), "x": np.array([[0, 1], [1, 0]]),
    "y": np.array([[0, -1j], [1j, 0]]), "z": np.diag([1, -1]),
}
MATRICES = {
    **PAULIS, "h": np.array([[1, 1], [1, -1]]) / np.sqrt(2),
    "s": np.diag([1, 1j]), "noisy_t": np.diag([1, np.exp(1j * np.pi / 4)]),
}


class StateVector:
    """|0…0⟩ on some qubits; qubit q is axis q. One-qubit gates wait until their
    qubit meets another."""

    def __init__(self, qubits):
        self.amplitudes = np.zeros((2,) * qubits, dtype=np.complex64)
        self.amplitudes[(0,) * qubits] = 1
        self.waiting = [np.eye(2)] * qubits

    def one_qubit(self, matrix, qubit):
        """A gate on one qubit, later."""
        self.waiting[qubit] = matrix @ self.waiting[qubit]

    def apply_waiting(self, qubit):
        """The product of the gates that wait."""
        matrix = self.waiting[qubit].astype(np.complex64)
        self.waiting[qubit] = np.eye(2)
        halves = self.amplitudes.reshape(2 ** qubit, 2, -1)
        low, high = halves[:, 0], halves[:, 1]
        result = np.empty_like(halves)
        result[:, 0] = matrix[0, 0] * low + matrix[0, 1] * high
        result[:, 1] = matrix[1, 0] * low + matrix[1, 1] * high
        self.amplitudes = result.reshape(self.amplitudes.shape)

    def cx(self, control, target):
        """Controlled X."""
        self.apply_waiting(control)
        self.apply_waiting(target)
        on = [slice(None)] * self.amplitudes.ndim
        on[control] = 1
        view = self.amplitudes[tuple(on)]
        view[...] = np.flip(view, axis=target - (target > control)).copy()

    def probabilities(self):
        """Of every outcome, qubit 0 most significant."""
        for qubit in range(len(self.waiting)):
            self.apply_waiting(qubit)
        flat = self.amplitudes.reshape(-1)
        return flat.real ** 2 + flat.imag ** 2


def shot(layers, qubits, rng):
    """(outcome as bits, whether any fault fired)."""
    state, faulty = StateVector(qubits), False
    for gate, *on in (gate for gates in layers for gate in gates):
        if gate == "noisy_cx":
            state.cx(*on)
            if rng.random() < line_circuits.CX_DEPOLARIZING:
                word, faulty = rng.integers(1, 16), True
                state.one_qubit(PAULIS["ixyz"[word >> 2]], on[0])
                state.one_qubit(PAULIS["ixyz"[word & 3]], on[1])
            continue
        state.one_qubit(MATRICES[gate], *on)
        if gate == "noisy_t" and rng.random() < line_circuits.T_DEPHASING:
            state.one_qubit(PAULIS["z"], *on)
            faulty = True
    cumulative = np.cumsum(state.probabilities(), dtype=np.float64)
    outcome = int(np.searchsorted(cumulative, rng.random() * cumulative[-1], side="right"))
    return [outcome >> qubits - 1 - qubit & 1 for qubit in range(qubits)], faulty


def plain_seconds(t_count):
    """Seconds of one shot of the state vector."""
    qubits = line_circuits.NOISY_T["qubits"]
    layers = line_circuits.noisy_layers(**line_circuits.NOISY_T, t_count=t_count)
    start = time.perf_counter()
    shot(layers, qubits, np.random.default_rng(1))
    return time.perf_counter() - start


def measure(bench):
    """Seconds a shot of both, for growing numbers of t."""
    # The state vector does not care how many of its gates are t.
    plain = plain_seconds(PLAIN_T)
    ratios = {}
    for t_count in T_COUNTS:
        what = f"24 qubits, {t_count} noisy t, delta = {DELTA}: state vector / walk"
        path = bench.folder / f"line-{t_count}-t.qasm"
        path.write_text(line_circuits.noisy_t(t_count))
        try:
            timing = bench.in_turns({"walk": Job(path, "walk", DELTA)})["walk"]
        except Refused as error:
            yield figures.refused(PART, what, error)
            continue
        ratios[t_count] = plain / timing.seconds
        yield figures.Figure(
            PART, what,
            f"{figures.number(ratios[t_count])} "
            f"({plain:.3g} s / {timing.seconds * 1e3:.3g} ms a shot)",
            values={"t_count": t_count, "state_vector_seconds": plain,
                    "walk_seconds": timing.seconds, "terms": timing.summary["terms"]})
    if len(ratios) > 1:
        yield break_even(ratios)


def break_even(ratios):
    """Where the state vector starts to win, from the last two ratios: they fall
    by a constant factor a t."""
    (first, above), (last, below) = sorted(ratios.items())[-2:]
    slope = math.log(above / below) / (last - first)
    count = last + math.log(below) / slope
    return figures.Figure(PART, "noisy t gates where both take as long, extrapolated",
                          f"{count:.0f}: walk wins below, state vector above",
                          values={"t_count": count})
