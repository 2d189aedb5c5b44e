"""Circuits whose answer is known in closed form, with that answer.

Each function returns (circuit, law): `law` holds the probability of every value
of the recorded bits, from a formula and not from simulation. The source stands
beside each formula. Codes and distillation are in code_circuits.py.
"""

import numpy as np

from circuit_builder import Circuit
from noise_channels import (amplitude_damping, bit_flip, bit_phase_flip, dephasing,
                            depolarizing, over_rotation, readout_flip, relaxation)

FACE_ANGLE = float(np.arccos(1 / np.sqrt(3)))
BASES = {"X": ["h"], "Y": ["sdg", "h"], "Z": []}


def coin(zero):
    """Law of one bit from the probability of 0."""
    return np.array([zero, 1 - zero])


def certain(value, width):
    """The law that always gives one value."""
    law = np.zeros(2 ** width)
    law[value] = 1
    return law


def interferometer(gate, parameters=(), noise=(), before=()):
    """h, one diagonal gate, h, measure."""
    circuit = Circuit()
    q, = circuit.qubits("q")
    c = circuit.bits("c", 1)
    circuit.gate("h", q)
    circuit.gate(gate, q, parameters=parameters, noise=noise, before=before)
    circuit.gate("h", q)
    circuit.measure(q, c[0])
    return circuit


def h_t_h():
    """P(0) = cos²(π/8). Arithmetic."""
    return interferometer("t"), coin(np.cos(np.pi / 8) ** 2)


def h_rz_h(angle):
    """P(0) = cos²(angle/2). Arithmetic."""
    return interferometer("rz", (angle,)), coin(np.cos(angle / 2) ** 2)


def over_rotated(angle, extra):
    """Rotations about one axis add. Definition."""
    circuit = interferometer("rz", (angle,), noise=[over_rotation("z", extra)])
    return circuit, coin(np.cos((angle + extra) / 2) ** 2)


def h_ccz_h():
    """P(000) = 9/16, every other 1/16. Arithmetic."""
    circuit = Circuit()
    q = circuit.qubits("q", 3)
    c = circuit.bits("c", 3)
    with circuit.verbatim("h q;"):
        for qubit in q:
            circuit.gate("h", qubit)
    circuit.gate("ccz", *q)
    with circuit.verbatim("h q;\nc = measure q;"):
        for qubit in q:
            circuit.gate("h", qubit)
        circuit.measure_all(q, c)
    law = np.full(8, 1 / 16)
    law[0] = 9 / 16
    return circuit, law


def ghz_parity(count, rotated, p):
    """GHZ state, t on some qubits each dephased by p, X parity of all qubits:
    P(even) = (1 + cos(mπ/4)(1 − 2p)^m)/2. Derived; one line of algebra."""
    circuit = Circuit()
    q = circuit.qubits("q", count)
    circuit.bits("m", count)
    parity = circuit.bits("parity", 1, role="check", output=True)
    m = circuit.registers[0]
    circuit.gate("h", q[0])
    with circuit.verbatim(f"for int i in [0:{count - 2}] {{ cx q[i], q[i + 1]; }}"):
        for i in range(count - 1):
            circuit.gate("cx", q[i], q[i + 1])
    for i in range(rotated):
        circuit.gate("t", q[i], noise=[dephasing(p)])
    for qubit in q:
        circuit.gate("h", qubit)
    circuit.measure_all(q, m)
    total = m[0]
    for bit in list(m)[1:]:
        total = total ^ bit
    circuit.assign(parity[0], total)
    even = (1 + np.cos(rotated * np.pi / 4) * (1 - 2 * p) ** rotated) / 2
    return circuit, coin(even)


def t_injection():
    """A t made from a T-type state, a measurement and an s correction equals t;
    the outcome is fair. Phys. Rev. A 71, 022316 (2005) for the idea."""
    circuit = Circuit()
    q = circuit.qubits("q", 2)
    outcome = circuit.bits("outcome", 1)
    wrong = circuit.bits("wrong", 1, role="logical")
    circuit.gate("ry", q[0], parameters=(0.7,))
    circuit.gate("rz", q[0], parameters=(0.4,))
    circuit.gate("h", q[1])
    circuit.gate("t", q[1])
    circuit.gate("cx", q[0], q[1])
    circuit.measure(q[1], outcome[0])
    with circuit.when(outcome[0]):
        circuit.gate("s", q[0])
    circuit.gate("tdg", q[0])
    circuit.gate("rz", q[0], parameters=(-0.4,))
    circuit.gate("ry", q[0], parameters=(-0.7,))
    circuit.measure(q[0], wrong[0])
    return circuit, np.array([0.5, 0.5, 0, 0])


def teleportation():
    """Teleportation is the identity. Phys. Rev. Lett. 70, 1895 (1993), from memory."""
    circuit = Circuit()
    q = circuit.qubits("q", 3)
    m = circuit.bits("m", 2)
    wrong = circuit.bits("wrong", 1, role="logical")
    circuit.gate("ry", q[0], parameters=(1.1,))
    circuit.gate("t", q[0])
    circuit.gate("h", q[1])
    circuit.gate("cx", q[1], q[2])
    circuit.gate("cx", q[0], q[1])
    circuit.gate("h", q[0])
    circuit.measure_all(q[:2], m)
    with circuit.when(m[1]):
        circuit.gate("x", q[2])
    with circuit.when(m[0]):
        circuit.gate("z", q[2])
    circuit.gate("tdg", q[2])
    circuit.gate("ry", q[2], parameters=(-1.1,))
    circuit.measure(q[2], wrong[0])
    return circuit, np.repeat([0.25, 0], 4)


def hidden_shift(half, shift, cubic):
    """Hidden shift of f(x, y) = x·y ⊕ g(x), g a sum of products of three bits
    given as index triples; the outcome is the shift for certain.
    arXiv:0811.3208; Phys. Rev. Lett. 116, 250501 (2016), from memory."""
    circuit = Circuit()
    fill_hidden_shift(circuit, half, shift, cubic, circuit.gate)
    return circuit, certain(shift, 2 * half)


def fill_hidden_shift(circuit, half, shift, cubic, three_qubit):
    """The gates of the hidden shift; `three_qubit(name, *qubits)` adds a ccz."""
    q = circuit.qubits("q", 2 * half)
    c = circuit.bits("c", 2 * half)
    shifted = [i for i in range(2 * half) if shift >> i & 1]

    def everywhere(name):
        for qubit in q:
            circuit.gate(name, qubit)

    def inner_product():
        for i in range(half):
            circuit.gate("cz", q[i], q[half + i])

    everywhere("h")
    for i in shifted:
        circuit.gate("x", q[i])
    inner_product()
    for triple in cubic:
        three_qubit("ccz", *(q[i] for i in triple))
    for i in shifted:
        circuit.gate("x", q[i])
    everywhere("h")
    inner_product()
    for triple in cubic:
        three_qubit("ccz", *(q[half + i] for i in triple))
    everywhere("h")
    circuit.measure_all(q, c)


def one_qubit_decay(p, repeats, basis):
    """Bloch factor (1 − 4p/3)^m in every basis, here by a noise-file rule on
    idle gates. Phys. Rev. A 77, 012307 (2008) for the form, from memory."""
    circuit = Circuit()
    q, = circuit.qubits("q")
    c = circuit.bits("c", 1)
    circuit.rule(["id"], depolarizing(p))
    for name in BASES[basis][::-1]:
        circuit.gate({"sdg": "s"}.get(name, name), q)
    with circuit.verbatim(f"for int i in [1:{repeats}] {{ id q; }}"):
        for _ in range(repeats):
            circuit.gate("id", q)
    for name in BASES[basis]:
        circuit.gate(name, q)
    circuit.measure(q, c[0])
    return circuit, coin((1 + (1 - 4 * p / 3) ** repeats) / 2)


def bell_fidelity(p):
    """Two-qubit depolarizing on a Bell pair: fidelity 1 − 4p/5, the three other
    Bell states share the rest evenly. Matrix arithmetic."""
    circuit = Circuit()
    q = circuit.qubits("q", 2)
    c = circuit.bits("c", 2)
    circuit.gate("h", q[0])
    circuit.gate("cx", *q, noise=[depolarizing(p)])
    circuit.gate("CX", *q)
    circuit.gate("h", q[0])
    circuit.measure_all(q, c)
    other = 4 * p / 15
    return circuit, np.array([1 - 3 * other, other, other, other])


def two_qubit_decay(p, repeats):
    """Pauli factor (1 − 16p/15)^m: P(00) = (1 + 3f)/4 from |00⟩. As above."""
    circuit = Circuit()
    q = circuit.qubits("q", 2)
    c = circuit.bits("c", 2)
    circuit.rule(["two-qubit"], depolarizing(p), place="before")
    for _ in range(repeats):
        circuit.gate("cz", *q)
    circuit.measure_all(q, c)
    factor = (1 - 16 * p / 15) ** repeats
    return circuit, np.array([1 + 3 * factor] + 3 * [1 - factor]) / 4


def flips_in_a_row(channel, p, repeats, gates):
    """m flips of probability p: p_m = (1 − (1 − 2p)^m)/2. Textbook."""
    circuit = Circuit()
    q, = circuit.qubits("q")
    c = circuit.bits("c", 1)
    for name in gates:
        circuit.gate(name, q)
    for _ in range(repeats):
        circuit.gate("id", q, noise=[channel(p)])
    for name in gates[::-1]:
        circuit.gate(name, q)
    circuit.measure(q, c[0])
    return circuit, coin((1 + (1 - 2 * p) ** repeats) / 2)


FLIPS = {
    "dephasing": (dephasing, ["h"]),
    "bit-flip": (bit_flip, []),
    "bit-phase-flip": (bit_phase_flip, ["h"]),
}


def damped(gamma, polar, azimuth, basis):
    """Amplitude damping of the state with Bloch angles (polar, azimuth):
    (x, y, z) → (√(1−γ)x, √(1−γ)y, γ + (1−γ)z). Textbook."""
    circuit = Circuit()
    q, = circuit.qubits("q")
    c = circuit.bits("c", 1)
    circuit.gate("ry", q, parameters=(polar,))
    circuit.gate("rz", q, parameters=(azimuth,), noise=[amplitude_damping(gamma)])
    for name in BASES[basis]:
        circuit.gate(name, q)
    circuit.measure(q, c[0])
    vector = {
        "X": np.sqrt(1 - gamma) * np.sin(polar) * np.cos(azimuth),
        "Y": np.sqrt(1 - gamma) * np.sin(polar) * np.sin(azimuth),
        "Z": gamma + (1 - gamma) * np.cos(polar),
    }
    return circuit, coin((1 + vector[basis]) / 2)


def damped_entangled(gamma):
    """One half of a Bell pair damped: P(00) = 1/2, P(10) = γ/2, P(11) = (1−γ)/2,
    with the damped qubit second. Textbook."""
    circuit = Circuit()
    q = circuit.qubits("q", 2)
    c = circuit.bits("c", 2)
    circuit.gate("h", q[0])
    circuit.gate("cx", *q)
    circuit.gate("id", q[1], noise=[amplitude_damping(gamma)])
    circuit.measure_all(q, c)
    return circuit, np.array([0.5, gamma / 2, 0, (1 - gamma) / 2])


def damped_ground(gamma, repeats):
    """Damping of |0⟩ does nothing (its Pauli twirl would flip it). Textbook."""
    circuit = Circuit()
    q, = circuit.qubits("q")
    c = circuit.bits("c", 1)
    for _ in range(repeats):
        circuit.gate("id", q, noise=[amplitude_damping(gamma)])
    circuit.measure(q, c[0])
    return circuit, certain(0, 1)


def relaxed(t1, t2, time, excited):
    """h, delay, h: P(0) = (1 + e^{−t/t2})/2; from |1⟩: P(1) = e^{−t/t1}.
    Times in µs. Textbook."""
    circuit = Circuit()
    q, = circuit.qubits("q")
    c = circuit.bits("c", 1)
    circuit.rule(["delay"], relaxation(f"{t1}us", f"{t2}us"))
    circuit.gate("x" if excited else "h", q)
    circuit.delay(f"{time}us", q)
    if not excited:
        circuit.gate("h", q)
    circuit.measure(q, c[0])
    if excited:
        return circuit, coin(1 - np.exp(-time / t1))
    return circuit, coin((1 + np.exp(-time / t2)) / 2)


def readout_in_condition(p01, p10):
    """P(1) = 0.4 before, read with the flip matrix; an x on a second qubit follows
    the recorded bit, the first qubit keeps its true value. Textbook."""
    circuit = Circuit()
    q = circuit.qubits("q", 2)
    read, true, copy = (circuit.bits(n, 1) for n in ("read", "true_value", "copy"))
    circuit.gate("ry", q[0], parameters=(2 * float(np.arcsin(np.sqrt(0.4))),))
    circuit.measure(q[0], read[0], noise=[readout_flip(p01, p10)])
    circuit.line("if (read[0] == 1) x q[1];")
    with circuit.verbatim(""), circuit.when(read[0]):
        circuit.gate("x", q[1])
    circuit.lines = [line for line in circuit.lines if line.strip()]
    circuit.measure(q[0], true[0])
    circuit.measure(q[1], copy[0])
    law = np.zeros(8)
    for value, probability in ((0, 0.6), (1, 0.4)):
        for recorded in (0, 1):
            flip = p10 if value else p01
            chance = flip if recorded != value else 1 - flip
            law[recorded + 2 * value + 4 * recorded] += probability * chance
    return circuit, law


def state_after_resets():
    """A qubit reset after it was entangled, then given a T-type state, while its
    old partner is reset as well: nothing of the past is left, and the state is
    undone for certain. Textbook."""
    circuit = Circuit()
    q = circuit.qubits("q", 2)
    c = circuit.bits("c", 1)
    circuit.gate("h", q[0])
    circuit.gate("cz", *q)
    circuit.reset(q[1])
    circuit.reset(q[0])
    circuit.gate("h", q[1])
    circuit.gate("t", q[1])
    circuit.gate("cx", *q)
    circuit.gate("tdg", q[1])
    circuit.gate("h", q[1])
    circuit.measure(q[1], c[0])
    return circuit, certain(0, 1)


def inverse_pair(count, rounds, seed):
    """A circuit and then its inverse: all zeros. Common practice, no source."""
    choose = np.random.default_rng(seed)
    circuit = Circuit()
    q = circuit.qubits("q", count)
    c = circuit.bits("c", count)
    inverse = {"t": "tdg", "tdg": "t", "s": "sdg", "sdg": "s", "sx": "sxdg"}
    calls = []
    for _ in range(rounds):
        name = str(choose.choice(["h", "s", "t", "tdg", "sx", "cx", "cz", "swap", "ccx",
                                  "ccz", "cswap", "rz", "rxx", "cp"]))
        width = {"cx": 2, "cz": 2, "swap": 2, "rxx": 2, "cp": 2,
                 "ccx": 3, "ccz": 3, "cswap": 3}.get(name, 1)
        qubits = [q[i] for i in choose.permutation(count)[:width]]
        angle = (round(float(choose.uniform(-3, 3)), 4),) if name in ("rz", "rxx", "cp") else ()
        calls.append((name, qubits, angle))
    for name, qubits, angle in calls:
        circuit.gate(name, *qubits, parameters=angle)
    for name, qubits, angle in calls[::-1]:
        circuit.gate(inverse.get(name, name), *qubits, parameters=tuple(-a for a in angle))
    circuit.measure_all(q, c)
    return circuit, certain(0, count)


def catalogue():
    """Name and (circuit, law) of every case."""
    cases = {
        "h t h": h_t_h(),
        "h rz(0.3) h": h_rz_h(0.3),
        "h rz(1.1) h": h_rz_h(1.1),
        "h rz(-2.5) h": h_rz_h(-2.5),
        "over-rotation adds": over_rotated(0.3, 0.55),
        "h ccz h": h_ccz_h(),
        "ghz 4, 3 t, 0.1": ghz_parity(4, 3, 0.1),
        "ghz 5, 5 t, 0.02": ghz_parity(5, 5, 0.02),
        "t injection": t_injection(),
        "teleportation": teleportation(),
        "hidden shift 6": hidden_shift(3, 0b101101, [(0, 1, 2)]),
        "hidden shift 8": hidden_shift(4, 0b01101001, [(0, 1, 2), (1, 2, 3)]),
        "bell fidelity": bell_fidelity(0.1),
        "two-qubit decay": two_qubit_decay(0.01, 10),
        "damped bell pair": damped_entangled(0.2),
        "damped ground state": damped_ground(0.2, 5),
        "relaxed coherence": relaxed(80, 60, 5, False),
        "relaxed excitation": relaxed(80, 60, 25, True),
        "readout flip": readout_in_condition(0.03, 0.11),
        "state after resets": state_after_resets(),
        "circuit and inverse": inverse_pair(4, 12, 5),
    }
    for basis in "XYZ":
        cases[f"one-qubit decay {basis}"] = one_qubit_decay(0.01, 10, basis)
        cases[f"damping {basis}"] = damped(0.2, 1.0, 0.7, basis)
    for name, (channel, gates) in FLIPS.items():
        cases[f"{name} three times"] = flips_in_a_row(channel, 0.01, 3, gates)
    return cases
