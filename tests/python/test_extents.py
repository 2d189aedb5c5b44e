"""Extents that the program records, against published and recomputed values.

Pure states and gates: Quantum 3, 181 (2019); the face-type state Phys. Rev. A 71,
022316 (2005); with noise PRX Quantum 2, 010345 (2021); all from memory, all
recomputed. An extent below a proven value is wrong; where a test says "between",
a larger one is legal. test_known_answers.py holds a first few.
"""

import unittest

import numpy as np

import program
from circuit_builder import Circuit
from known_circuits import FACE_ANGLE, interferometer
from noise_channels import dephasing, depolarizing

T = 1.171572875254
FACE = 1.267949192431
CCZ = 16 / 9
QUARTER = ("pi/4", np.pi / 4)


def extent(circuit):
    """ξ of a run of the circuit."""
    return program.run(circuit, 2, seed=1, readout="walk", terms=2,
                       companion=2).attributes["extent"]


def between_hadamards(count, fill):
    """h on every qubit, gates, h on every qubit, all measured."""
    circuit = Circuit()
    q = circuit.qubits("q", count)
    c = circuit.bits("c", count)
    for qubit in q:
        circuit.gate("h", qubit)
    fill(circuit, q)
    for qubit in q:
        circuit.gate("h", qubit)
    circuit.measure_all(q, c)
    return circuit


def entangled_t(circuit, q):
    """t on every qubit of a cluster state."""
    for a, b in zip(q, q[1:]):
        circuit.gate("cz", a, b)
    for qubit in q:
        circuit.gate("h", qubit)
        circuit.gate("t", qubit)


def prepared(*calls):
    """Gates (name, parameters, noise) on a fresh qubit, entangled, measured."""
    circuit = Circuit()
    q = circuit.qubits("q", 2)
    c = circuit.bits("c", 2)
    for name, parameters, noise in calls:
        circuit.gate(name, q[0], parameters=parameters, noise=noise)
    circuit.gate("cx", *q)
    circuit.gate("h", q[0])
    circuit.measure_all(q, c)
    return circuit


class Pure(unittest.TestCase):
    def test_rotations(self):
        """(cos(θ/2) + tan(π/8)·sin(θ/2))² for θ folded into (0, π/2)."""
        for angle, expected in ((0.01, 1.0041213561), (0.1, 1.0392830127),
                                (0.2, 1.0740348374), (0.3, 1.1039082456),
                                (0.5, 1.1478775971), (1.1, 1.1428222784),
                                (1.5, 1.0282626978), (np.pi / 2 + 0.2, 1.0740348374),
                                (-0.3, 1.1039082456), (np.pi / 4, T)):
            for gate in ("rz", "p"):
                with self.subTest(gate, angle=angle):
                    self.assertAlmostEqual(extent(interferometer(gate, (angle,))), expected, 9)

    def test_face_type_state(self):
        """3 − √3."""
        found = extent(prepared(("ry", (FACE_ANGLE,), ()), ("rz", (QUARTER,), ())))
        self.assertAlmostEqual(found, FACE, 9)

    def test_three_qubit_gates(self):
        for gate, turned in (("ccz", ()), ("ccx", (2,)), ("cswap", (2,))):
            def fill(circuit, q):
                # Out of the eigenstates that h on all qubits makes of the target.
                for target in turned:
                    circuit.gate("h", q[target])
                circuit.gate(gate, *q)

            with self.subTest(gate):
                self.assertAlmostEqual(extent(between_hadamards(3, fill)), CCZ, 9)

    def test_controlled_phase(self):
        """Between the dual bound over all two-qubit stabiliser states and three
        rotations by half the angle."""
        for text, angle, least in (("pi/2", np.pi / 2, 1.6), ("pi/4", np.pi / 4, 1.42426406),
                                   ("pi/8", np.pi / 8, 1.22959442)):
            with self.subTest(text):
                found = extent(between_hadamards(
                    2, lambda c, q: c.gate("cp", *q, parameters=((text, angle),))))
                most = (np.cos(angle / 4) + np.tan(np.pi / 8) * np.sin(angle / 4)) ** 6
                self.assertGreaterEqual(found, least)
                self.assertLessEqual(found, most * (1 + 1e-9))

    def test_a_toffoli_written_out(self):
        """Between 16/9 and that of seven t, 3.029599058."""
        def fill(circuit, q):
            a, b, c = q
            for name, *on in (("cx", b, c), ("tdg", c), ("cx", a, c), ("t", c), ("cx", b, c),
                              ("tdg", c), ("cx", a, c), ("t", b), ("t", c), ("cx", a, b),
                              ("t", a), ("tdg", b), ("cx", a, b)):
                circuit.gate(name, *on)

        found = extent(between_hadamards(3, fill))
        self.assertGreaterEqual(found, CCZ * (1 - 1e-9))
        self.assertLessEqual(found, 3.029599058 * (1 + 1e-9))

    def test_products_of_t(self):
        for count, expected in ((8, 3.549396079), (16, 12.598212529), (20, 23.734832061),
                                (40, 563.342252979)):
            with self.subTest(count):
                found = extent(between_hadamards(count, entangled_t))
                self.assertAlmostEqual(found / expected, 1, 9)

    def test_products_of_ccz(self):
        for count, expected in ((4, 9.988721232), (8, 99.774551841)):
            def fill(circuit, q):
                for first in range(0, 3 * count, 3):
                    circuit.gate("ccz", *q[first:first + 3])

            with self.subTest(count):
                self.assertAlmostEqual(
                    extent(between_hadamards(3 * count, fill)) / expected, 1, 9)


class Noisy(unittest.TestCase):
    def test_dephased_t(self):
        """max(1, (1 − p)·extent of t), on a fresh qubit and on an entangled one."""
        for p, expected in ((0.01, 1.159857146501), (0.05, 1.112994231491),
                            (0.1, 1.054415587728), (0.14, 1.007552672718),
                            (0.146446609407, 1.0), (0.2, 1.0)):
            def fill(circuit, q):
                circuit.gate("cz", *q)
                circuit.gate("h", q[0])
                circuit.gate("t", q[0], noise=[dephasing(p)])

            with self.subTest(p):
                self.assertAlmostEqual(extent(interferometer("t", noise=[dephasing(p)])),
                                       expected, 9)
                self.assertAlmostEqual(extent(between_hadamards(2, fill)), expected, 9)

    def test_depolarized_t_type_state(self):
        """max(1, (1 − 2p/3)·extent of t); 1 from p = (3/4)(1 − 1/√2) on."""
        for p, expected in ((0.02, 1.155951903584), (0.1, 1.093468016904),
                            (0.2, 1.015363158553), (0.219669914110, 1.0), (0.3, 1.0)):
            with self.subTest(p):
                found = extent(prepared(("h", (), ()), ("t", (), [depolarizing(p)])))
                self.assertAlmostEqual(found, expected, 9)

    def test_depolarized_t_gate(self):
        """On an arbitrary state at most 2p/3 + (1 − p)·extent of t on average; the
        part that is not turned by X or Y has (1 − q)·extent of t, q = (p/3)/(1 −
        2p/3)."""
        for p, mean in ((0.01, 1.166523813), (0.1, 1.121082254)):
            def fill(circuit, q):
                circuit.gate("cz", *q)
                circuit.gate("h", q[0])
                circuit.gate("t", q[0], noise=[depolarizing(p)])

            with self.subTest(p):
                q = (p / 3) / (1 - 2 * p / 3)
                found = extent(between_hadamards(2, fill))
                self.assertLessEqual(found, (1 - q) * T * (1 + 1e-9))
                self.assertAlmostEqual((1 - 2 * p / 3) * (1 - q) * T + 2 * p / 3, mean, 8)

    def test_depolarized_face_type_state(self):
        """max(1, (1 − 2p/3)·(3 − √3)); 1 from p = (3/4)(1 − 1/√3) on."""
        for p, expected in ((0.02, 1.251043203199), (0.1, 1.183419246269),
                            (0.3, 1.014359353945), (0.316987298108, 1.0), (0.4, 1.0)):
            with self.subTest(p):
                found = extent(prepared(("ry", (FACE_ANGLE,), ()),
                                        ("rz", (QUARTER,), [depolarizing(p)])))
                self.assertAlmostEqual(found, expected, 9)


if __name__ == "__main__":
    unittest.main()
