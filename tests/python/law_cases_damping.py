"""Mixing-law circuits with amplitude damping of entangled qubits.

At each of them the companion has the map P̃ = sρ + (1−s)·P0ρP0 + K1ρK1†, s =
√(1−γ), P0 = |0⟩⟨0|, K1 = √γ·|0⟩⟨1|, in place of the damping, and its trace t enters
the law: P_out = [(k − 1)·P + ξ·P̃_out]/(k − 1 + ξ·t). Derived: K0 = s·1 + (1−s)·P0 is
a sum of two terms like a site, with (Σ|c|)² = 1; drawing one of the two for every
term admixes s·ρ + (1−s)·P0ρP0 as the components of a site do.
"""

from law_cases import spread
from noise_channels import amplitude_damping


def damped_pair(c):
    """One qubit of an entangled pair damped between two t."""
    q = c.qubits("q", 2)
    m = c.bits("m", 2)
    c.gate("h", q[0])
    c.gate("cx", *q)
    c.gate("h", q[1])
    c.rotation("t", q[1])
    c.damp(q[1], 0.5)
    c.gate("h", q[1])
    c.rotation("t", q[0])
    c.gate("h", q[0])
    c.measure_all(q, m)


def damped_strongly(c):
    """Damping near 1, and twice."""
    q = c.qubits("q", 2)
    m = c.bits("m", 2)
    spread(c, q)
    c.gate("cz", *q)
    spread(c, q)
    c.rotation("t", q[0])
    c.damp(q[0], 0.9)
    c.gate("h", q[0])
    c.gate("cx", q[0], q[1])
    c.rotation("t", q[1])
    c.damp(q[1], 0.7)
    c.gate("h", q[1])
    c.gate("h", q[0])
    c.measure_all(q, m)


def damped_clifford(c):
    """No site at all: only the damping makes terms."""
    q = c.qubits("q", 3)
    m = c.bits("m", 3)
    c.gate("h", q[0])
    c.gate("cx", q[0], q[1])
    c.gate("cx", q[1], q[2])
    c.gate("h", q[1])
    c.damp(q[1], 0.6)
    c.gate("h", q[1])
    c.gate("cx", q[1], q[0])
    c.damp(q[0], 0.6)
    spread(c, q)
    c.measure_all(q, m)


def damped_often(c):
    """So often that the companion's trace shows in the drawn law itself."""
    q = c.qubits("q", 2)
    m = c.bits("m", 2)
    c.gate("h", q[0])
    c.gate("cx", *q)
    for _ in range(3):
        for qubit in q:
            c.gate("h", qubit)
            c.damp(qubit, 0.75)
        c.gate("h", q[0])
        c.gate("cx", *q)
    c.measure_all(q, m)


def damped_in_a_gate(c):
    """Damping as the noise of a two-qubit gate, on both qubits, then a generic
    rotation."""
    q = c.qubits("q", 2)
    m = c.bits("m", 2)
    spread(c, q)
    c.rotation("t", q[0])
    c.gate("cx", *q)
    c.gate("h", q[0])
    c.gate("cz", *q)
    for qubit in q:
        c.damp(qubit, 0.4)
    c.gate("h", q[1])
    c.rotation("rz", q[1], parameters=(0.7,))
    spread(c, q)
    c.measure_all(q, m)


def relaxed_pair(c):
    """Relaxation: damping, then dephasing that stays where it is."""
    q = c.qubits("q", 2)
    m = c.bits("m", 2)
    spread(c, q)
    c.rotation("t", q[0])
    c.gate("cz", *q)
    spread(c, q)
    c.relax(q[0], 80.0, 60.0, 50.0)
    c.gate("h", q[0])
    c.gate("cx", *q)
    c.rotation("t", q[1])
    spread(c, q)
    c.measure_all(q, m)


def damped_after_measurement(c):
    """An inner measurement, feedback, and damping after it."""
    q = c.qubits("q", 3)
    m = c.bits("m", 1)
    out = c.bits("out", 2)
    spread(c, q)
    c.gate("cz", q[0], q[1])
    c.gate("cz", q[1], q[2])
    spread(c, q)
    c.rotation("t", q[0])
    c.gate("h", q[0])
    c.measure(q[0], m[0])
    with c.when(m[0]):
        c.gate("s", q[1])
    c.rotation("t", q[1])
    c.damp(q[1], 0.5)
    c.gate("h", q[1])
    c.damp(q[2], 0.5)
    c.gate("h", q[2])
    c.measure_all(q[1:], out)


def damped_in_a_branch(c):
    """Damping that a measured bit decides about, which changes what comes after."""
    q = c.qubits("q", 3)
    m = c.bits("m", 1)
    out = c.bits("out", 2)
    spread(c, q)
    c.gate("cz", q[0], q[1])
    c.gate("cz", q[1], q[2])
    spread(c, q)
    c.rotation("t", q[0])
    c.gate("h", q[0])
    c.measure(q[0], m[0])
    c.rotation("t", q[1])
    with c.when(m[0]):
        c.damp(q[1], 0.8)
    c.gate("h", q[1])
    c.gate("cx", q[1], q[2])
    c.gate("h", q[2])
    c.measure_all(q[1:], out)


def damped_face_state(c):
    """A generic prepared state, entangled, then damped; the damping of the fresh
    qubit before belongs to the prepared state."""
    q = c.qubits("q", 2)
    m = c.bits("m", 2)
    c.prepare(q[0], ("ry", (0.8,), [amplitude_damping(0.1)]), ("rz", (0.6,), []))
    c.gate("h", q[1])
    c.gate("cx", q[0], q[1])
    c.gate("h", q[0])
    c.damp(q[0], 0.5)
    c.gate("h", q[0])
    c.gate("s", q[1])
    c.gate("h", q[1])
    c.damp(q[1], 0.5)
    c.measure_all(q, m)
