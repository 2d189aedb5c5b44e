"""Mixing-law circuits with sites after measurements, resets and in branches.

The law of `walk` is exact for them; that of `probe` is not, where an inner
measurement lies between sites.
"""

from known_circuits import FACE_ANGLE
from law_cases import QUARTER, spread
from noise_channels import dephasing, readout_flip


def t_after_measurement(c):
    """An inner measurement between two pairs of t, its outcome recorded."""
    q = c.qubits("q", 3)
    m = c.bits("m", 1)
    out = c.bits("out", 2)
    spread(c, q)
    c.gate("cz", q[0], q[1])
    c.gate("cz", q[1], q[2])
    spread(c, q)
    c.rotation("t", q[0])
    c.rotation("t", q[1])
    spread(c, q)
    c.measure(q[0], m[0])
    c.gate("cx", q[1], q[2])
    c.rotation("t", q[2])
    c.gate("h", q[1])
    c.rotation("tdg", q[1])
    spread(c, q[1:])
    c.measure_all(q[1:], out)


def rotation_in_a_branch(c):
    """A site in each branch: both are drawn, one is executed."""
    q = c.qubits("q", 2)
    m = c.bits("m", 1)
    out = c.bits("out", 2)
    spread(c, q)
    c.rotation("t", q[0])
    c.gate("h", q[0])
    c.gate("cx", *q)
    c.measure(q[0], m[0], noise=[readout_flip(0.05)])
    c.gate("h", q[1])
    c.gate("s", q[1])
    c.gate("h", q[1])
    with c.when(m[0]):
        c.rotation("t", q[1])
    with c.otherwise():
        c.rotation("rz", q[1], parameters=(-0.6,))
    c.gate("h", q[1])
    c.gate("cx", q[1], q[0])
    c.measure_all(q, out)


def ccz_after_feedback(c):
    """A measured qubit decides a flip, then comes a ccz."""
    q = c.qubits("q", 3)
    m = c.bits("m", 1)
    out = c.bits("out", 3)
    spread(c, q)
    c.rotation("t", q[0])
    c.gate("h", q[0])
    c.gate("cx", q[0], q[1])
    c.measure(q[0], m[0])
    c.gate("h", q[0])
    with c.when(m[0]):
        c.gate("x", q[2])
        c.gate("s", q[1])
    c.gate("h", q[1])
    c.three_qubit("ccz", *q)
    spread(c, q)
    c.measure_all(q, out)


def reset_and_again(c):
    """A face-type state, measured by parity, reset, prepared again."""
    q = c.qubits("q", 2)
    m = c.bits("m", 1)
    out = c.bits("out", 2)
    c.prepare(q[0], ("ry", (FACE_ANGLE,), []), ("rz", (QUARTER,), []))
    c.prepare(q[1], ("h", (), []), ("t", (), [dephasing(0.03)]))
    c.gate("cx", *q)
    c.measure(q[1], m[0])
    c.reset(q[1])
    c.prepare(q[1], ("ry", (0.8,), []), ("rz", (0.6,), []))
    c.gate("h", q[0])
    c.gate("cx", *q)
    c.gate("h", q[0])
    c.measure_all(q, out)


def teleported_t(c):
    """A state with a t teleported with both corrections, then one more t."""
    q = c.qubits("q", 3)
    m = c.bits("m", 2)
    out = c.bits("out", 1)
    c.prepare(q[0], ("h", (), []), ("t", (), [dephasing(0.02)]))
    c.gate("h", q[0])
    c.gate("h", q[1])
    c.gate("cx", q[1], q[2])
    c.gate("cx", q[0], q[1])
    c.gate("h", q[0])
    c.measure_all(q[:2], m)
    with c.when(m[1]):
        c.gate("x", q[2])
    with c.when(m[0]):
        c.gate("z", q[2])
    c.rotation("t", q[2])
    c.gate("h", q[2])
    c.measure(q[2], out[0])
