"""Noise channels as maps on density tensors.

A density tensor of r qubits has 2r axes of length 2: axis a is the row index of
qubit a, axis r + a its column index. Every channel is written from its
definition, as Kraus operators, or for depolarizing as the mixture with the
maximally mixed state. Sources: textbook forms; they are checked against
published numbers in test_reference.py.
"""

import itertools
import re
from dataclasses import dataclass, field

import numpy as np

from gate_matrices import PAULI, pauli_word, rotation

DURATION = {"ns": 1e-9, "us": 1e-6, "ms": 1e-3, "s": 1.0}


def seconds(duration):
    """Length in seconds of a duration such as "80us"."""
    number, unit = re.fullmatch(r"([0-9.]+)(ns|us|ms|s)", duration).groups()
    return float(number) * DURATION[unit]


def operate(density, matrix, axes):
    """K ρ K† with K on the listed qubits of the tensor."""
    rank = density.ndim // 2
    m = len(axes)
    operator = np.asarray(matrix, dtype=complex).reshape((2,) * (2 * m))
    rows = list(axes)
    columns = [rank + a for a in axes]
    density = np.tensordot(operator, density, axes=(range(m, 2 * m), rows))
    density = np.moveaxis(density, range(m), rows)
    density = np.tensordot(operator.conj(), density, axes=(range(m, 2 * m), columns))
    return np.moveaxis(density, range(m), columns)


def kraus_sum(density, operators, axes):
    """Σ K ρ K†."""
    return sum(operate(density, k, axes) for k in operators)


def mixed_in_place(density, axes):
    """The listed qubits replaced by the maximally mixed state."""
    rank = density.ndim // 2
    others = [a for a in range(rank) if a not in axes]
    order = others + list(axes)
    moved = density.transpose(order + [rank + a for a in order])
    size, block = 2 ** len(others), 2 ** len(axes)
    kept = np.einsum("iaja->ij", moved.reshape(size, block, size, block))
    full = np.einsum("ij,ab->iajb", kept, np.eye(block) / block)
    full = full.reshape((2,) * (2 * rank))
    inverse = np.argsort(order)
    return full.transpose(list(inverse) + [rank + a for a in inverse])


def depolarize(density, axes, p):
    """With probability p one of the 4^m − 1 non-identity Paulis, uniformly."""
    mix = p * 4 ** len(axes) / (4 ** len(axes) - 1)
    return (1 - mix) * density + mix * mixed_in_place(density, axes)


def pauli_kraus(probabilities):
    """Kraus operators of a random Pauli; the identity takes the rest."""
    width = len(next(iter(probabilities)))
    rest = 1 - sum(probabilities.values())
    operators = [np.sqrt(max(rest, 0)) * np.eye(2 ** width)]
    return operators + [np.sqrt(p) * pauli_word(w) for w, p in probabilities.items()]


def damping_kraus(gamma):
    """Amplitude damping."""
    return [
        np.array([[1, 0], [0, np.sqrt(1 - gamma)]]),
        np.array([[0, np.sqrt(gamma)], [0, 0]]),
    ]


def relaxation_kraus(t1, t2, time):
    """Damping with 1 − e^{−t/t1}, then dephasing that leaves coherence e^{−t/t2}."""
    gamma = 1 - np.exp(-time / t1)
    flip = (1 - np.exp(-time / t2 + time / (2 * t1))) / 2
    return [
        np.sqrt(weight) * pauli @ k
        for weight, pauli in ((1 - flip, PAULI["I"]), (flip, PAULI["Z"]))
        for k in damping_kraus(gamma)
    ]


@dataclass(frozen=True)
class Channel:
    """A channel as written: its name and its arguments."""

    name: str
    arguments: tuple = ()
    words: dict = field(default_factory=dict, hash=False)

    def text(self):
        """The channel as it stands in a file."""
        parts = [a if isinstance(a, str) else repr(a) for a in self.arguments]
        parts += [f"{word}={p!r}" for word, p in self.words.items()]
        return f"{self.name}({', '.join(parts)})"

    @property
    def is_readout(self):
        """Whether it acts on the recorded bit only."""
        return self.name == "readout-flip"

    def flips(self):
        """(p01, p10) of a readout flip."""
        return (self.arguments * 2)[:2]

    def apply(self, density, axes, delay=None):
        """The channel on the qubits of one call; `delay` in seconds, if any."""
        if self.name == "depolarizing":
            return depolarize(density, axes, self.arguments[0])
        if self.name == "pauli":
            return kraus_sum(density, pauli_kraus(self.words), axes)
        for axis in axes:
            if self.name == "depolarizing-each":
                density = depolarize(density, [axis], self.arguments[0])
            else:
                density = kraus_sum(density, self._each(delay), [axis])
        return density

    def _each(self, delay):
        """Kraus operators of the channels that act on every qubit on its own."""
        if self.name in ("dephasing", "bit-flip", "bit-phase-flip"):
            letter = {"dephasing": "Z", "bit-flip": "X", "bit-phase-flip": "Y"}
            return pauli_kraus({letter[self.name]: self.arguments[0]})
        if self.name == "amplitude-damping":
            return damping_kraus(self.arguments[0])
        if self.name == "relaxation":
            t1, t2 = (seconds(a) for a in self.arguments[:2])
            time = seconds(self.arguments[2]) if len(self.arguments) == 3 else delay
            return relaxation_kraus(t1, t2, time)
        if self.name == "over-rotation":
            axis, angle = self.arguments
            return [rotation(axis.upper(), angle)]
        raise ValueError(f"no channel {self.name}")


def depolarizing(p):
    return Channel("depolarizing", (p,))


def depolarizing_each(p):
    return Channel("depolarizing-each", (p,))


def dephasing(p):
    return Channel("dephasing", (p,))


def bit_flip(p):
    return Channel("bit-flip", (p,))


def bit_phase_flip(p):
    return Channel("bit-phase-flip", (p,))


def pauli(**words):
    return Channel("pauli", (), words)


def amplitude_damping(gamma):
    return Channel("amplitude-damping", (gamma,))


def relaxation(*durations):
    return Channel("relaxation", durations)


def over_rotation(axis, angle):
    return Channel("over-rotation", (axis, angle))


def readout_flip(*probabilities):
    return Channel("readout-flip", probabilities)


def all_pauli_words(width):
    """Every word of that many letters but the identity."""
    words = ("".join(w) for w in itertools.product("IXYZ", repeat=width))
    return [w for w in words if w != "I" * width]
