"""Stabiliser codes and magic-state distillation: circuits and closed formulas.

Codes: independent depolarizing on every code qubit between two noise-free
rounds of syndrome measurement. With B the weight enumerator of the normaliser
and A that of the stabiliser, P(trivial syndrome) = Σ B_j (p/3)^j (1−p)^(n−j),
and with A in place of B also no logical error. Phys. Rev. Lett. 78, 1600 (1997),
from memory.

Distillation: Phys. Rev. A 71, 022316 (2005) for 15-to-1 and 5-to-1; Phys. Rev. A
87, 032321 (2013) and 87, 022328 (2013), from memory, for eight T to one CCZ.
"""

import itertools

import numpy as np

from circuit_builder import Circuit
from known_circuits import FACE_ANGLE
from noise_channels import dephasing, depolarizing, depolarizing_each

FIVE = ["XZZXI", "IXZZX", "XIXZZ", "ZXIXZ"]
FIVE_LOGICAL = ["XXXXX", "ZZZZZ"]
STEANE = ["IIIXXXX", "IXXIIXX", "XIXIXIX", "IIIZZZZ", "IZZIIZZ", "ZIZIZIZ"]
STEANE_LOGICAL = ["X" * 7, "Z" * 7]
FOUR = ["XXXX", "ZZZZ"]

# Weight enumerators (A, B) as published; recomputed in test_codes.py.
ENUMERATORS = {
    "five": ([1, 0, 0, 0, 15, 0], [1, 0, 0, 30, 15, 18]),
    "steane": ([1, 0, 0, 0, 21, 0, 42, 0], [1, 0, 0, 21, 21, 126, 42, 45]),
    "four": ([1, 0, 0, 0, 3], [1, 0, 18, 24, 21]),
}
CODES = {"five": (FIVE, FIVE_LOGICAL), "steane": (STEANE, STEANE_LOGICAL), "four": (FOUR, [])}


def enumerator_sum(enumerator, p):
    """Σ_j E_j (p/3)^j (1−p)^(n−j)."""
    n = len(enumerator) - 1
    return sum(e * (p / 3) ** j * (1 - p) ** (n - j) for j, e in enumerate(enumerator))


def commute(a, b):
    """Whether two Pauli words commute."""
    return sum(x != y and "I" not in (x, y) for x, y in zip(a, b)) % 2 == 0


def normaliser_enumerator(stabilisers):
    """Number of Pauli words of each weight that commute with every stabiliser."""
    n = len(stabilisers[0])
    counts = [0] * (n + 1)
    for word in itertools.product("IXYZ", repeat=n):
        if all(commute(word, s) for s in stabilisers):
            counts[n - word.count("I")] += 1
    return counts


def product(a, b):
    """Product of two Pauli words, sign left out."""
    return "".join("IXZY"["IXZY".index(x) ^ "IXZY".index(y)] for x, y in zip(a, b))


def stabiliser_enumerator(stabilisers):
    """Number of stabiliser elements of each weight."""
    n = len(stabilisers[0])
    counts = [0] * (n + 1)
    for choice in itertools.product((0, 1), repeat=len(stabilisers)):
        word = "I" * n
        for used, stabiliser in zip(choice, stabilisers):
            word = product(word, stabiliser) if used else word
        counts[n - word.count("I")] += 1
    return counts


def measure_pauli(circuit, word, data, ancilla, bit):
    """Parity of a Pauli word by an ancilla."""
    circuit.reset(ancilla)
    circuit.gate("h", ancilla)
    for letter, qubit in zip(word, data):
        if letter != "I":
            circuit.gate("c" + letter.lower(), ancilla, qubit)
    circuit.gate("h", ancilla)
    circuit.measure(ancilla, bit)


def code_memory(name, p, logical):
    """Two rounds about one layer of depolarizing. With `logical`, a reference
    qubit is entangled with the encoded one, so that every logical error shows."""
    stabilisers, logicals = CODES[name]
    n = len(stabilisers[0])
    # The reference qubit is the last of the data and carries the same letter.
    words = [s + "I" for s in stabilisers]
    if logical:
        words += [w + w[0] for w in logicals]
    circuit = Circuit()
    data = circuit.qubits("data", n + 1)
    ancilla, = circuit.qubits("ancilla")
    rounds = [circuit.bits(f"round{i}", len(words)) for i in (1, 2)]
    syndrome = circuit.bits("syndrome", len(stabilisers), role="check", output=True)
    error = circuit.bits("error", 2, role="logical", output=True) if logical else None
    for i, bits in enumerate(rounds):
        for word, bit in zip(words, bits):
            measure_pauli(circuit, word, data, ancilla, bit)
        if i == 0:
            for qubit in data[:n]:
                circuit.gate("id", qubit, noise=[depolarizing_each(p)])
    for i in range(len(words)):
        target = syndrome[i] if i < len(stabilisers) else error[i - len(stabilisers)]
        circuit.assign(target, rounds[0][i] ^ rounds[1][i])
    return circuit


def parity_rotation(circuit, qubits, gate):
    """A diagonal gate on the parity of some qubits, by a ladder of cx."""
    for a, b in zip(qubits, qubits[1:]):
        circuit.gate("cx", a, b)
    circuit.gate(gate, qubits[-1])
    for a, b in list(zip(qubits, qubits[1:]))[::-1]:
        circuit.gate("cx", a, b)


def fifteen_to_one(p):
    """All fifteen nonzero parities of four checks, each with the output: tdg on
    the output. Returns the circuit, P(accept) and P(wrong given accepted)."""
    circuit = Circuit()
    checks, output = circuit.qubits("x", 4), circuit.qubits("y", 1)
    rejected = circuit.bits("rejected", 4, role="check")
    wrong = circuit.bits("wrong", 1, role="logical")
    circuit.rule(["t"], dephasing(p))
    for qubit in checks + output:
        circuit.gate("h", qubit)
    for mask in range(1, 16):
        parity_rotation(circuit, [x for i, x in enumerate(checks) if mask >> i & 1] + output,
                        "t")
    for qubit in checks:
        circuit.gate("h", qubit)
    circuit.measure_all(checks, rejected)
    circuit.gate("p", *output, parameters=(("pi/4", np.pi / 4),))
    circuit.gate("h", *output)
    circuit.measure_all(output, wrong)
    z = 1 - 2 * p
    accept = (1 + 15 * z ** 8) / 16
    error = (1 - 15 * z ** 7 + 15 * z ** 8 - z ** 15) / (32 * accept)
    return circuit, accept, error


def eight_to_ccz(p):
    """t or tdg on the eight parities of three qubits with a check: ccz on the
    three. Returns the circuit, P(accept) and P(wrong given accepted)."""
    circuit = Circuit()
    data, check = circuit.qubits("x", 3), circuit.qubits("y", 1)
    rejected = circuit.bits("rejected", 1, role="check")
    wrong = circuit.bits("wrong", 3, role="logical")
    circuit.rule(["t", "tdg"], dephasing(p))
    for qubit in data + check:
        circuit.gate("h", qubit)
    for mask in range(8):
        parity_rotation(circuit, [x for i, x in enumerate(data) if mask >> i & 1] + check,
                        "tdg" if mask.bit_count() % 2 else "t")
    circuit.gate("h", *check)
    circuit.measure_all(check, rejected)
    circuit.gate("ccz", *data)
    for qubit in data:
        circuit.gate("h", qubit)
    circuit.measure_all(data, wrong)
    accept = (1 + (1 - 2 * p) ** 8) / 2
    good = (1 - p) ** 8 + 14 * p ** 4 * (1 - p) ** 4 + p ** 8
    return circuit, accept, 1 - good / accept


def five_to_one(p):
    """Five face-type states with depolarizing p, syndrome of the five-qubit code,
    decoding, measurement along (1,1,1), where a good output gives 1. Returns the
    circuit, P(accept) and P(wrong given accepted)."""
    circuit = Circuit()
    data = circuit.qubits("data", 5)
    ancilla, output = circuit.qubits("ancilla", 2)
    rejected = circuit.bits("rejected", 4, role="check")
    wrong = circuit.bits("wrong", 1, role="logical")
    for qubit in data:
        circuit.gate("ry", qubit, parameters=(FACE_ANGLE,))
        circuit.gate("rz", qubit, parameters=(("pi/4", np.pi / 4),), noise=[depolarizing(p)])
    for word, bit in zip(FIVE, rejected):
        measure_pauli(circuit, word, data, ancilla, bit)
    # Logical Z is ZZZZZ, logical X is XXXXX: two logical cx move the state out.
    for qubit in data:
        circuit.gate("cx", qubit, output)
    for qubit in data:
        circuit.gate("cx", output, qubit)
    circuit.gate("rz", output, parameters=(("-pi/4", -np.pi / 4),))
    circuit.gate("ry", output, parameters=(-FACE_ANGLE,))
    circuit.gate("x", output)
    circuit.measure(output, wrong[0])
    e = 2 * p / 3
    t = e / (1 - e)
    accept = (e ** 5 + 5 * e ** 2 * (1 - e) ** 3 + 5 * e ** 3 * (1 - e) ** 2
              + (1 - e) ** 5) / 6
    return circuit, accept, (t ** 5 + 5 * t ** 2) / (1 + 5 * t ** 2 + 5 * t ** 3 + t ** 5)


DISTILLATION = {
    "15-to-1": (fifteen_to_one, 4),
    "8T-to-CCZ": (eight_to_ccz, 1),
    "5-to-1": (five_to_one, 4),
}
# (protocol, parameter p of the circuit): published accept and error.
PUBLISHED = {
    ("15-to-1", 0.01): (0.860090333670, 3.608768396532e-05),
    ("15-to-1", 0.05): (0.466063009375, 5.140367045552e-03),
    ("15-to-1", 0.1): (0.219786400000, 4.772674001769e-02),
    ("8T-to-CCZ", 0.01): (0.925381511291, 2.849292262e-03),
    ("8T-to-CCZ", 0.05): (0.715233605000, 7.234266401e-02),
    ("5-to-1", 0.075): (0.130843750000, 1.365177932e-02),
    ("5-to-1", 0.15): (0.105166666667, 5.778129952e-02),
}


def accepted_and_wrong(law, checks):
    """(P(accept), P(wrong given accepted)) of a law or counts whose first bits
    are checks and whose other bits tell an error."""
    table = np.asarray(law).reshape(-1, 2 ** checks)[:, 0]
    return table.sum(), table[1:].sum() / table.sum()
