"""Mixing-law circuits with rotations by angles other than π/4.

Extent (cos(θ/2) + tan(π/8)·sin(θ/2))² without noise, Quantum 3, 181 (2019), from
memory; with noise on the axis that of the dephased resource state, PRX Quantum 2,
010345 (2021), from memory. Both come from `law_circuits.rotation_site`.
"""

import numpy as np

from circuit_builder import number_value
from law_cases import spread
from noise_channels import bit_flip, dephasing, depolarizing, over_rotation, pauli


def entangled(c, count):
    """Qubits in a cluster state turned so that Z axes are generic; three in a ring,
    because at the ends of a chain Z of both acts alike on the state."""
    q = c.qubits("q", count)
    spread(c, q)
    for a, b in zip(q, q[1:]):
        c.gate("cz", a, b)
    if count == 3:
        c.gate("cz", q[0], q[2])
    spread(c, q)
    return q


def three_angles(c):
    """On both sides of π/4 and beyond π/2."""
    m_count = 3
    q = entangled(c, m_count)
    m = c.bits("m", m_count)
    for qubit, angle in zip(q, (0.45, 1.2, 2.3)):
        c.rotation("rz", qubit, parameters=(angle,))
    spread(c, q)
    c.measure_all(q, m)


def small_angles(c):
    """Angles of a tenth of a turn and less, where the components have very
    different weights."""
    q = entangled(c, 3)
    m = c.bits("m", 3)
    for qubit, angle in zip(q, (0.2, -0.25, 0.3)):
        c.rotation("p", qubit, parameters=(angle,))
        c.gate("h", qubit)
    c.gate("cx", q[0], q[2])
    c.gate("cz", q[1], q[2])
    c.rotation("rz", q[2], parameters=(0.3,))
    spread(c, q)
    c.measure_all(q, m)


def dephased_rotations(c):
    """A dephased generic rotation: two members at other angles, which do not
    change places as those of a t do."""
    q = entangled(c, 2)
    m = c.bits("m", 2)
    for qubit, angle, p in zip(q, (0.6, -1.1), (0.04, 0.03)):
        c.rotation("rz", qubit, parameters=(angle,), noise=[dephasing(p)], dephasing=p)
    spread(c, q)
    c.measure_all(q, m)


def depolarized_rotation(c):
    """Depolarizing p after a rotation on an entangled qubit merges its Z part,
    q = (p/3)/(1 − 2p/3). Superoperator identity."""
    p = 0.05
    q = entangled(c, 2)
    m = c.bits("m", 2)
    for qubit, angle in zip(q, (0.5, 0.9)):
        first = len(c.statements)
        c.rotation("rz", qubit, parameters=(angle,), noise=[depolarizing(p)],
                   dephasing=(p / 3) / (1 - 2 * p / 3))
        if c.companion:
            c.statements[first].after = (pauli(X=p / 3, Y=p / 3),)
    spread(c, q)
    c.measure_all(q, m)


def over_rotated(c):
    """An over-rotation about the axis of the gate adds to its angle."""
    q = entangled(c, 2)
    m = c.bits("m", 2)
    for qubit, angle, extra in zip(q, (0.3, 1.0), (0.25, -0.2)):
        c.merged_rotation("rz", qubit, angle, [over_rotation("z", extra)], angle + extra)
    spread(c, q)
    c.measure_all(q, m)


def flips_before_rotations(c):
    """A flip before a rotation turns it backwards; no part of it merges."""
    q = entangled(c, 2)
    m = c.bits("m", 2)
    for qubit, angle in zip(q, (("pi/4", np.pi / 4), 0.8)):
        c.gate("id", qubit, noise=[bit_flip(0.15)])
        c.rotation("rz", qubit, parameters=(angle,))
    c.gate("sx", q[0])
    c.gate("cx", *q)
    c.gate("sx", q[1])
    c.rotation("rz", q[1], parameters=(number_value(-0.55),))
    spread(c, q)
    c.measure_all(q, m)
