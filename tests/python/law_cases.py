"""Circuits on which the mixing law is tested, one function each: t-like places,
prepared states, ccz, Pauli axes, noise about them. More are in
law_cases_rotations.py, law_cases_adaptive.py and law_cases_damping.py;
law_catalogue.py lists all.

Each function takes a `LawCircuit` (ideal or companion meaning) and fills it.
"""

import numpy as np

from known_circuits import FACE_ANGLE
from noise_channels import (all_pauli_words, amplitude_damping, bit_flip, dephasing,
                            depolarizing, over_rotation, pauli, readout_flip)

QUARTER = ("pi/4", np.pi / 4)


def spread(c, qubits):
    """h on every qubit."""
    for qubit in qubits:
        c.gate("h", qubit)


def one_t(c):
    q, = c.qubits("q")
    m = c.bits("m", 1)
    c.gate("h", q)
    c.rotation("t", q)
    c.gate("h", q)
    c.measure(q, m[0])


def one_rotation(c):
    q, = c.qubits("q")
    m = c.bits("m", 1)
    c.gate("h", q)
    c.rotation("rz", q, parameters=(1.1,))
    c.gate("h", q)
    c.measure(q, m[0])


def negative_rotation(c):
    q, = c.qubits("q")
    m = c.bits("m", 1)
    c.gate("h", q)
    c.rotation("rz", q, parameters=(-2.5,))
    c.gate("sx", q)
    c.measure(q, m[0])


def dephased_t(c):
    q = c.qubits("q", 2)
    m = c.bits("m", 2)
    spread(c, q)
    for qubit in q:
        c.rotation("t", qubit, noise=[dephasing(0.05)], dephasing=0.05)
    c.gate("cz", *q)
    spread(c, q)
    c.measure_all(q, m)


def face_states(c):
    q = c.qubits("q", 3)
    m = c.bits("m", 3)
    for qubit in q:
        c.prepare(qubit, ("ry", (FACE_ANGLE,), []), ("rz", (QUARTER,), []))
    c.gate("h", q[0])
    c.gate("cx", q[0], q[1])
    c.gate("s", q[2])
    c.gate("h", q[2])
    c.gate("cz", q[1], q[2])
    spread(c, q)
    c.measure_all(q, m)


def noisy_face_states(c):
    q = c.qubits("q", 2)
    m = c.bits("m", 2)
    for qubit in q:
        c.prepare(qubit, ("ry", (FACE_ANGLE,), []), ("rz", (QUARTER,), [depolarizing(0.1)]))
    # Nothing of either qubit alone is read: no rotation of it goes unseen.
    c.gate("cz", *q)
    spread(c, q)
    c.measure_all(q, m)


def generic_states(c):
    """One state of the face case, one of the edge case, one damped."""
    q = c.qubits("q", 3)
    m = c.bits("m", 3)
    c.prepare(q[0], ("ry", (0.8,), []), ("rz", (0.6,), [depolarizing(0.02)]))
    c.prepare(q[1], ("ry", (1.5,), []), ("rz", (0.7,), [dephasing(0.03)]))
    c.prepare(q[2], ("ry", (2.2,), [amplitude_damping(0.1)]),
              ("rz", (-0.9,), [over_rotation("x", 0.2)]))
    # Nothing of any qubit alone is read: no rotation of it goes unseen.
    c.gate("cz", q[0], q[1])
    c.gate("cz", q[1], q[2])
    spread(c, q)
    c.measure_all(q, m)


def one_ccz(c):
    q = c.qubits("q", 3)
    m = c.bits("m", 3)
    spread(c, q)
    c.three_qubit("ccz", *q)
    spread(c, q)
    c.measure_all(q, m)


def toffoli_and_swap(c):
    q = c.qubits("q", 4)
    m = c.bits("m", 4)
    spread(c, q)
    c.gate("s", q[2])
    c.three_qubit("ccx", q[0], q[1], q[2])
    c.gate("h", q[3])
    c.gate("cx", q[2], q[3])
    c.three_qubit("cswap", q[3], q[2], q[0])
    spread(c, q[:2])
    c.measure_all(q, m)


def entangled_t(c):
    """t gates on qubits that are not fresh, about axes that the state tells apart;
    they are sites of their own."""
    q = c.qubits("q", 3)
    m = c.bits("m", 3)
    spread(c, q)
    c.gate("cz", q[0], q[1])
    c.gate("cz", q[1], q[2])
    c.gate("cz", q[0], q[2])
    spread(c, q)
    for qubit, name in zip(q, ("t", "tdg", "t")):
        c.rotation(name, qubit, noise=[dephasing(0.02)], dephasing=0.02)
    spread(c, q)
    c.measure_all(q, m)


def depolarized_t(c):
    """Depolarizing p after a t on an entangled qubit merges its Z part,
    q = (p/3)/(1 − 2p/3); X and Y with p/3 each are left. Superoperator identity."""
    p = 0.06
    q = c.qubits("q", 2)
    m = c.bits("m", 2)
    spread(c, q)
    c.gate("cz", *q)
    spread(c, q)
    for qubit in q:
        first = len(c.statements)
        c.rotation("t", qubit, noise=[depolarizing(p)], dephasing=(p / 3) / (1 - 2 * p / 3))
        if c.companion:
            c.statements[first].after = (pauli(X=p / 3, Y=p / 3),)
    spread(c, q)
    c.measure_all(q, m)


def pauli_axes(c):
    """Rotations about X, Y, XX, YY and ZZ, no two of which act alike on the state."""
    q = c.qubits("q", 3)
    m = c.bits("m", 3)
    c.gate("h", q[0])
    c.gate("cx", q[0], q[1])
    c.gate("s", q[1])
    c.gate("h", q[1])
    c.gate("cx", q[1], q[2])
    c.rotation("rx", q[0], parameters=(0.5,))
    c.rotation("ryy", q[1], q[2], parameters=(2.0,))
    c.rotation("ry", q[1], parameters=(-0.8,))
    c.rotation("rxx", q[0], q[2], parameters=(-0.6,))
    c.gate("h", q[2])
    c.rotation("rzz", q[2], q[1], parameters=(0.9,))
    c.gate("h", q[1])
    c.gate("h", q[2])
    c.measure_all(q, m)


def noise_in_between(c):
    """Flips, joint noise and readout error between and after the sites; no Pauli
    here commutes to the axis of a site, so that nothing merges."""
    q = c.qubits("q", 3)
    m = c.bits("m", 3)
    c.rule(["cx"], pauli(XI=0.04, ZX=0.03, IZ=0.05))
    c.rule(["measure"], readout_flip(0.02, 0.07))
    spread(c, q)
    c.gate("cx", q[0], q[1])
    c.gate("s", q[1])
    c.gate("h", q[1])
    c.rotation("t", q[1])
    c.gate("id", q[1], noise=[bit_flip(0.1)])
    c.gate("h", q[1])
    c.gate("cx", q[1], q[2])
    c.gate("sx", q[2])
    c.rotation("t", q[2])
    spread(c, q)
    c.measure_all(q, m)


def noise_that_reaches_a_site(c):
    """Joint depolarizing p, then sx, then t: the Pauli IY of the channel is the
    axis of the site. Paired with the identity it is a dephasing of
    q = (p/15)/(1 − 14p/15), which merges; every other Pauli and its partner have
    equal weight and stay. Same identity as for a t right before."""
    p = 0.1
    q = c.qubits("q", 2)
    m = c.bits("m", 2)
    spread(c, q)
    c.gate("cz", *q)
    spread(c, q)
    c.gate("cx", *q, noise=[depolarizing(p)])
    if c.companion:
        rest = {w: p / 15 for w in all_pauli_words(2) if w != "IY"}
        c.statements[-1].after = (pauli(**rest),)
    c.gate("sx", q[1])
    c.rotation("t", q[1], dephasing=(p / 15) / (1 - 14 * p / 15))
    spread(c, q)
    c.measure_all(q, m)


def injection(c):
    """Two t by injection with feedback: sites, measurement, correction, and the
    corrections change what follows."""
    q = c.qubits("q", 4)
    m = c.bits("m", 2)
    out = c.bits("out", 2)
    for magic in q[2:]:
        c.prepare(magic, ("h", (), []), ("t", (), [dephasing(0.03)]))
    c.gate("h", q[0])
    c.gate("cx", q[0], q[1])
    c.gate("h", q[1])
    for data, magic, bit in zip(q[:2], q[2:], m):
        c.gate("cx", data, magic)
        c.measure(magic, bit)
        with c.when(bit):
            c.gate("s", data)
    c.gate("cz", q[0], q[1])
    spread(c, q[:2])
    c.measure_all(q[:2], out)


def state_after_a_measurement(c):
    """A site that comes after the first measurement must not be felt by it: the
    phases of its components belong to the components, not to the terms before.
    (Sites between measurements change the law a little, here by 0.2 %.)"""
    q = c.qubits("q", 2)
    m = c.bits("m", 3)
    c.gate("h", q[0])
    c.rotation("t", q[0])
    c.gate("h", q[0])
    c.measure(q[0], m[0])
    c.prepare(q[1], ("u3", (2.1457, 1.079, -2.534), []), ("p", (-3.061,), []))
    # Nothing of the second qubit alone is read: no rotation of it goes unseen.
    c.gate("h", q[0])
    c.gate("cz", *q)
    spread(c, q)
    c.measure_all(q, m[1:])


def two_ccz(c):
    """Two ccz that share a qubit, behind an entangling layer."""
    q = c.qubits("q", 5)
    m = c.bits("m", 5)
    spread(c, q)
    c.three_qubit("ccz", q[0], q[1], q[2])
    c.gate("h", q[2])
    c.gate("cx", q[3], q[2])
    c.three_qubit("ccz", q[2], q[3], q[4])
    spread(c, q)
    c.measure_all(q, m)


def ccz_among_t(c):
    """ccz, t and a face-type state in one circuit."""
    q = c.qubits("q", 4)
    m = c.bits("m", 4)
    c.prepare(q[3], ("ry", (FACE_ANGLE,), []), ("rz", (QUARTER,), []))
    spread(c, q[:3])
    c.three_qubit("ccz", *q[:3])
    c.gate("h", q[1])
    c.gate("cx", q[1], q[3])
    c.rotation("t", q[3])
    c.gate("h", q[3])
    c.rotation("tdg", q[1], noise=[dephasing(0.04)], dephasing=0.04)
    spread(c, q[:3])
    c.measure_all(q, m)


def ghz_of_t(c):
    """Parity of a GHZ state with four dephased t."""
    q = c.qubits("q", 4)
    m = c.bits("m", 4)
    c.gate("h", q[0])
    for a, b in zip(q, q[1:]):
        c.gate("cx", a, b)
    # Each t about an axis of its own, so that no two make one gate.
    for i, qubit in enumerate(q):
        c.rotation("t", qubit, noise=[dephasing(0.02)], dephasing=0.02)
        if i < 3:
            c.gate("h", qubit)
            c.gate("cx", qubit, q[i + 1])
    spread(c, q)
    c.measure_all(q, m)
