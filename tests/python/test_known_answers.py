"""Circuits with a known answer, drawn by the program.

Every case of known_circuits.py in `dense`, where the law is the formula itself:
false-alarm rate 1e-6 a test, as many shots as catch a 1 % error with
probability 0.99 (about 140,000 for one bit, up to 400,000 for a certain outcome
of eight bits, where a single wrong shot fails). Sources stand beside the formulas.
"""

import unittest

import numpy as np

import goodness_of_fit as fit
import known_circuits
import program
from circuit_builder import Circuit
from known_circuits import interferometer
from noise_channels import dephasing


def shots_for(law):
    """Shots that catch a 1 % error; an impossible outcome needs far fewer."""
    return fit.shots_needed(max(int((law > 0).sum()), 2))


class Dense(unittest.TestCase):
    def test_catalogue(self):
        for seed, (name, (circuit, law)) in enumerate(known_circuits.catalogue().items()):
            with self.subTest(name):
                out = program.run(circuit, shots_for(law), seed=1000 + seed)
                counts = out.counts()
                self.assertGreater(fit.fit_p_value(counts, law), fit.FALSE_ALARM,
                                   f"{counts / counts.sum()} for {law}")
                self.assertNotIn("terms", out.attributes)


class Probe(unittest.TestCase):
    """Certain outcomes with sparse terms: the share of wrong shots is at most
    δ/2 = 5 %, by a one-sided binomial bound at 1e-6; the companion's share says
    that δ is used (not all shots are right)."""

    def test_hidden_shift(self):
        circuit, law = known_circuits.hidden_shift(3, 0b101101, [(0, 1, 2)])
        shots = 4000
        out = program.run(circuit, shots, seed=71, readout="probe", delta=0.1)
        wrong = shots - out.counts()[0b101101]
        self.assertLess(wrong, shots * 0.05 + 5 * np.sqrt(shots * 0.05 * 0.95))
        self.assertAlmostEqual(out.attributes["extent"], (16 / 9) ** 2, 8)

    def test_inverse_pair(self):
        circuit, _ = known_circuits.inverse_pair(4, 7, 2)
        shots = 4000
        out = program.run(circuit, shots, seed=72, readout="probe", delta=0.2)
        wrong = shots - out.counts()[0]
        self.assertLess(wrong, shots * 0.1 + 5 * np.sqrt(shots * 0.1 * 0.9))


class Wide(unittest.TestCase):
    """Many idle or Clifford-only qubits cost little and answer exactly."""

    def test_ghz_on_two_hundred_qubits(self):
        """GHZ outcomes are all equal and fair; common practice, no source."""
        circuit = Circuit()
        q = circuit.qubits("q", 200)
        c = circuit.bits("c", 200)
        circuit.gate("h", q[0])
        with circuit.verbatim("for int i in [0:198] { cx q[i], q[i + 1]; }\nc = measure q;"):
            for a, b in zip(q, q[1:]):
                circuit.gate("cx", a, b)
            circuit.measure_all(q, c)
        out = program.run(circuit, 20_000, seed=73)
        bits = out.shots["c"]
        self.assertTrue((bits == bits[:, :1]).all())
        self.assertGreater(fit.binomial_p_value(bits[:, 0].sum(), 20_000, 0.5),
                           fit.FALSE_ALARM)


class Extents(unittest.TestCase):
    """ξ as recorded. Quantum 3, 181 (2019), from memory, without noise; PRX
    Quantum 2, 010345 (2021), from memory, with it."""

    def extent(self, circuit, shots=10, **options):
        return program.run(circuit, shots, seed=1, readout="probe", terms=2,
                           **options).attributes["extent"]

    def test_one_gate(self):
        for gate, parameters, expected in (
            ("t", (), 1.171572875254), ("tdg", (), 1.171572875254),
            ("rz", (0.1,), 1.0392830127), ("rz", (-0.3,), 1.1039082456),
            ("p", (1.5,), 1.0282626978), ("rz", (np.pi / 2 + 0.5,), 1.1478775971),
            ("s", (), 1.0), ("rz", (np.pi,), 1.0),
        ):
            self.assertAlmostEqual(self.extent(interferometer(gate, parameters)), expected, 9)

    def test_dephased_t(self):
        for p, expected in ((0.01, 1.159857146501), (0.1, 1.054415587728), (0.15, 1.0),
                            (0.146446609407, 1.0)):
            for place in ("noise", "before"):
                circuit = interferometer("t", **{place: [dephasing(p)]})
                self.assertAlmostEqual(self.extent(circuit), expected, 9)
        both = interferometer("t", noise=[dephasing(0.03)], before=[dephasing(0.05)])
        self.assertAlmostEqual(self.extent(both), (1 - 0.077) * 1.171572875254, 9)

    def test_absorption_can_be_turned_off(self):
        """Without merging a dephased t has the extent of a t, and the same law."""
        circuit = interferometer("t", noise=[dephasing(0.1)])
        out = program.run(circuit, 150_000, seed=8, readout="dense", extra=["--absorb", "off"])
        law = known_circuits.coin((1 + np.cos(np.pi / 4) * 0.8) / 2)
        self.assertGreater(fit.fit_p_value(out.counts(), law), fit.FALSE_ALARM)
        self.assertAlmostEqual(
            self.extent(circuit, extra=["--absorb", "off"]), 1.171572875254, 9)

    def test_over_rotation_adds_to_the_angle(self):
        circuit, _ = known_circuits.over_rotated(0.2, 0.3)
        self.assertAlmostEqual(self.extent(circuit), 1.1478775971, 9)

    def test_products(self):
        """Eight t on entangled qubits: 3.549396079; a written ccz is 16/9."""
        circuit = Circuit()
        q = circuit.qubits("q", 8)
        c = circuit.bits("c", 8)
        for qubit in q:
            circuit.gate("h", qubit)
        for a, b in zip(q, q[1:]):
            circuit.gate("cz", a, b)
        for qubit in q:
            circuit.gate("h", qubit)
        for qubit in q:
            circuit.gate("t", qubit)
        for qubit in q:
            circuit.gate("h", qubit)
        circuit.measure_all(q, c)
        self.assertAlmostEqual(self.extent(circuit), 3.549396079, 8)
        self.assertAlmostEqual(self.extent(known_circuits.h_ccz_h()[0]), 16 / 9, 10)


if __name__ == "__main__":
    unittest.main()
