"""Circuits for the mixing law, each with its companion stated independently.

At small numbers of terms k the drawn law is, by construction of the
sparsification, P_out = [(k − 1)·P + ξ·P_comp]/(k − 1 + ξ), with P_comp the law of
the companion circuit: every non-Clifford place replaced by a random stabiliser
component. One line of algebra; the construction is PRX Quantum 2, 010345 (2021),
from memory.

The companion of one place is the stabiliser mixture σ with ρ ≤ Ξ·σ at the least
Ξ, ρ the place's resource state. It is found here numerically: for one qubit,
Ξσ − ρ ≥ 0 says |Ξs − r| ≤ Ξ − 1 with s in the octahedron, so Ξ is where the
distance of r from the scaled octahedron equals Ξ − 1. For a ccz it is the even
mixture of the eight diagonal Clifford gates that add up to it (Quantum 3, 181
(2019); the sum is checked in test_mixing_law.py).
"""

import numpy as np

import gate_matrices
from circuit_builder import Circuit, Statement, number_value
from noise_channels import amplitude_damping, damping_kraus, relaxation
from reference import bloch_vector

# Which of Z1 Z2 Z3 CZ12 CZ23 CZ13 make up each of the eight diagonals, and the
# sign with which it enters 6·CCZ.
CCZ_DIAGONALS = [
    ("000000", 1), ("000100", 1), ("000010", 1), ("000001", 1),
    ("100101", 1), ("010110", 1), ("001011", 1), ("111111", -1),
]


def ccz_components():
    """The eight diagonals as matrices."""
    bits = np.array([[i >> 2 & 1, i >> 1 & 1, i & 1] for i in range(8)])
    a, b, c = bits.T
    forms = np.array([a, b, c, a & b, b & c, a & c])
    return [np.diag((-1.0) ** (np.array([int(x) for x in word]) @ forms))
            for word, _ in CCZ_DIAGONALS]


def onto_octahedron(vector, size):
    """Nearest point with |x| + |y| + |z| ≤ size."""
    magnitudes = np.abs(vector)
    if magnitudes.sum() <= size:
        return np.array(vector, dtype=float)
    ordered = np.sort(magnitudes)[::-1]
    excess = (np.cumsum(ordered) - size) / np.arange(1, len(ordered) + 1)
    threshold = excess[np.flatnonzero(ordered > excess)[-1]]
    return np.sign(vector) * (magnitudes - threshold).clip(0)


def nearest_mixture(bloch):
    """(Ξ, Bloch vector of σ) of a one-qubit state."""
    bloch = np.asarray(bloch, dtype=float)
    low, high = 1.0, 2.0
    for _ in range(80):
        middle = (low + high) / 2
        gap = np.linalg.norm(onto_octahedron(bloch, middle) - bloch)
        low, high = (middle, high) if gap > middle - 1 else (low, middle)
    return high, onto_octahedron(bloch, high) / high


def rotation_site(angle, dephasing):
    """(Ξ, [(probability, multiple of π/2)]) of a rotation dephased on its axis."""
    turns = int(np.floor(angle / (np.pi / 2)))
    rest = angle - turns * np.pi / 2
    r = (1 - 2 * dephasing) * np.array([np.cos(rest), np.sin(rest), 0])
    extent, (x, y, _) = nearest_mixture(r)
    return extent, [(x / (x + y), turns), (y / (x + y), turns + 1)]


AXES = {"t": "Z", "tdg": "Z", "rz": "Z", "p": "Z", "rx": "X", "ry": "Y",
        "rzz": "ZZ", "rxx": "XX", "ryy": "YY"}
ANGLES = {"t": np.pi / 4, "tdg": -np.pi / 4}
AROUND_CCZ = {
    "ccz": np.eye(8),
    "ccx": gate_matrices.kron(np.eye(4), gate_matrices.H),
}


class LawCircuit(Circuit):
    """A circuit whose meaning is either the ideal or the companion circuit; the
    text is the same. `extent` collects ξ."""

    def __init__(self, companion):
        super().__init__()
        self.companion = companion
        self.extent = 1.0

    def _replace_last(self, first, operators):
        """The statements from `first` on become one Kraus map in the companion."""
        if self.companion:
            qubits = self._block[first].qubits
            del self._block[first:]
            self._block.append(Statement("kraus", qubits, value=operators))

    def rotation(self, name, *qubits, parameters=(), noise=(), dephasing=0.0):
        """A rotation that is one site; `dephasing` is what its noise merges to."""
        angle = number_value(parameters[0]) if parameters else ANGLES[name]
        first = len(self._block)
        self.gate(name, *qubits, parameters=parameters, noise=noise)
        extent, mixture = rotation_site(angle, dephasing)
        self.extent *= extent
        self._replace_last(first, [
            np.sqrt(p) * gate_matrices.rotation(AXES[name], turns * np.pi / 2)
            for p, turns in mixture
        ])

    def merged_rotation(self, name, qubit, angle, noise, whole):
        """A rotation whose noise makes it one by another angle, `whole`."""
        first = len(self._block)
        self.gate(name, qubit, parameters=(angle,), noise=noise)
        extent, mixture = rotation_site(whole, 0.0)
        self.extent *= extent
        self._replace_last(first, [
            np.sqrt(p) * gate_matrices.rotation(AXES[name], turns * np.pi / 2)
            for p, turns in mixture
        ])

    def damp(self, qubit, gamma):
        """Amplitude damping of an entangled qubit; its companion is not normalised."""
        first = len(self._block)
        self.gate("id", qubit, noise=[amplitude_damping(gamma)])
        self._replace_last(first, damping_companion(gamma))

    def relax(self, qubit, t1, t2, time):
        """Relaxation of an entangled qubit, times in µs: damping with 1 − e^{−t/t1},
        then dephasing that leaves coherence e^{−t/t2}. Textbook."""
        first = len(self._block)
        self.gate("id", qubit, noise=[relaxation(f"{t1}us", f"{t2}us", f"{time}us")])
        flip = (1 - np.exp(-time / t2 + time / (2 * t1))) / 2
        self._replace_last(first, [
            np.sqrt(weight) * pauli @ k
            for weight, pauli in ((1 - flip, gate_matrices.I), (flip, gate_matrices.Z))
            for k in damping_companion(1 - np.exp(-time / t1))
        ])

    def three_qubit(self, name, *qubits):
        """ccz, ccx or cswap as one site."""
        first = len(self._block)
        self.gate(name, *qubits)
        self.extent *= 16 / 9
        if name == "cswap":
            cx = gate_matrices.kron(gate_matrices.I, np.eye(4)[[0, 3, 2, 1]])
            frame = AROUND_CCZ["ccx"] @ cx
        else:
            frame = AROUND_CCZ[name]
        self._replace_last(first, [
            frame.conj().T @ d @ frame / np.sqrt(8) for d in ccz_components()
        ])

    def prepare(self, qubit, *calls):
        """Gates on a fresh qubit that together are one site: each call is (name,
        parameters, noise)."""
        first = len(self._block)
        vector = np.array([0.0, 0.0, 1.0])
        for name, parameters, noise in calls:
            self.gate(name, qubit, parameters=parameters, noise=noise)
            vector = turned(gate_matrices.matrix(name, self._block[-1].parameters), vector)
            vector = bloch_vector(noise, vector)
        extent, sigma = nearest_mixture(vector)
        self.extent *= extent
        if extent < 1 + 1e-12:
            sigma = vector
        density = (np.eye(2) + sum(s * gate_matrices.PAULI[w] for s, w in zip(sigma, "XYZ"))) / 2
        values, vectors = np.linalg.eigh(density)
        self._replace_last(first, [
            np.sqrt(max(v, 0)) * np.outer(vectors[:, i], row)
            for i, v in enumerate(values) for row in np.eye(2)
        ])


def damping_companion(gamma):
    """Operators of sρ + (1−s)·P0ρP0 + K1ρK1†, s = √(1−γ); see law_cases_damping.py."""
    s = np.sqrt(1 - gamma)
    return [np.sqrt(s) * np.eye(2), np.sqrt(1 - s) * np.diag([1.0, 0.0]),
            damping_kraus(gamma)[1]]


def turned(unitary, vector):
    """Bloch vector after a unitary."""
    paulis = [gate_matrices.PAULI[letter] for letter in "XYZ"]
    density = unitary @ (np.eye(2) + sum(v * p for v, p in zip(vector, paulis))) @ unitary.conj().T
    return np.array([np.trace(density @ p).real / 2 for p in paulis])


def mixing_weight(extent, terms, trace=1.0):
    """λ = ξt/(k − 1 + ξt), t the trace of the companion's state."""
    return extent * trace / (terms - 1 + extent * trace)
