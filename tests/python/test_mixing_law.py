"""The mixing law at small numbers of terms, where the admixture is large.

`LawByHand` checks the independent companion (law_circuits.py) against published
extents and against a sum over all draws. `Program` compares drawn shots with
[(k − 1)·P + ξ·P_comp]/(k − 1 + ξ), false-alarm rate 1e-6 a test, and the
companion's own shots with P_comp. Every case is required to be sharp: the shots
would tell the law from the ideal law with a power of at least 0.99. `dense` draws
from P itself. Each read-out draws more than a million shots over all circuits of
law_catalogue.py. With 32,000 shots an error of about 2 % total variation is
caught; the number of probes is set by a small --delta so that their bias stays
below 0.2 %.
"""

import itertools
import unittest
from typing import NamedTuple

import numpy as np

import goodness_of_fit as fit
import law_cases
import law_circuits
from law_catalogue import CASES
import program
import random_circuits
from law_circuits import LawCircuit, mixing_weight
from reference import distribution

SHOTS = 32_000
# Sets the number of probes only; the number of terms is given by hand.
DELTA = 0.02
SHARP = 0.99


class Laws(NamedTuple):
    """The exact laws of a case; the trace is 1 without damping."""

    circuit: LawCircuit
    ideal: np.ndarray
    companion: np.ndarray
    extent: float
    trace: float

    def share(self, terms):
        """λ, the companion's share among the drawn shots."""
        return mixing_weight(self.extent, terms, self.trace)

    def drawn(self, terms):
        """P_out."""
        return (1 - self.share(terms)) * self.ideal + self.share(terms) * self.companion


def laws(build):
    """The exact laws of a case."""
    ideal, companion = LawCircuit(False), LawCircuit(True)
    build(ideal)
    build(companion)
    if ideal.text() != companion.text() or ideal.extent != companion.extent:
        raise AssertionError("ideal and companion circuit are not the same text")
    state = distribution(companion)
    return Laws(ideal, distribution(ideal), state / state.sum(), ideal.extent, state.sum())


class LawByHand(unittest.TestCase):
    def test_extents(self):
        """Quantum 3, 181 (2019) for t and rotations; Phys. Rev. A 71, 022316 (2005)
        for the face-type state; PRX Quantum 2, 010345 (2021) with noise."""
        diagonal = np.array([1, 1, 0]) / np.sqrt(2)
        face = np.array([1, 1, 1]) / np.sqrt(3)
        for bloch, extent in (
            (diagonal, 1.171572875254), (face, 1.267949192431),
            (0.9 * diagonal, 1.112994231491), (0.72 * diagonal, 1.007552672718),
            ((1 - 4 * 0.02 / 3) * diagonal, 1.155951903584),
            ((1 - 4 * 0.2 / 3) * diagonal, 1.015363158553),
            ((1 - 4 * 0.1 / 3) * face, 1.183419246269), ((1 - 4 * 0.3 / 3) * face, 1.014359353945),
            ((np.cos(0.3), np.sin(0.3), 0), 1.1039082456),
            ((np.cos(1.5), np.sin(1.5), 0), 1.0282626978),
            (0.7 * diagonal, 1.0), ((0.3, 0.3, 0.4), 1.0),
        ):
            self.assertAlmostEqual(law_circuits.nearest_mixture(bloch)[0], extent, 9)

    def test_weights_of_a_rotation(self):
        """Normalised weights of identity and S: √2 sin(π/4 − θ/2) and √2 sin(θ/2)."""
        for angle, first in ((0.3, 0.79885468), (np.pi / 4, 0.5), (1.1, 0.30853924)):
            extent, mixture = law_circuits.rotation_site(angle, 0.0)
            self.assertAlmostEqual(mixture[0][0], first, 7)
            self.assertAlmostEqual(
                extent, (np.cos(angle / 2) + np.tan(np.pi / 8) * np.sin(angle / 2)) ** 2, 9)

    def test_ccz_is_the_sum_of_its_components(self):
        signs = [sign for _, sign in law_circuits.CCZ_DIAGONALS]
        total = sum(s * d for s, d in zip(signs, law_circuits.ccz_components())) / 6
        np.testing.assert_allclose(total, np.diag([1] * 7 + [-1]), atol=1e-14)

    def test_published_companions(self):
        """Recomputed values: h t h, h rz h, h ccz h."""
        for build, first in ((law_cases.one_t, 0.75), (law_cases.one_rotation, 0.654269621158),
                             (law_cases.one_ccz, 0.34375)):
            self.assertAlmostEqual(laws(build).companion[0], first, 9)

    def test_sum_over_all_draws(self):
        """The law itself, by adding up every draw of k components with its
        probability and its unnormalised output, for one t and for one ccz."""
        components = [np.eye(2), np.diag([1, 1j])]
        weights = np.linalg.solve(np.array([[1, 1], [1, 1j]]), [1, np.exp(1j * np.pi / 4)])
        ccz = ([s / 6 for _, s in law_circuits.CCZ_DIAGONALS], law_circuits.ccz_components())
        h = np.array([[1, 1], [1, -1]]) / np.sqrt(2)
        for (w, parts), build, width, k in (((weights, components), law_cases.one_t, 1, 3),
                                            (ccz, law_cases.one_ccz, 3, 3)):
            layer = np.array([[1.0]])
            for _ in range(width):
                layer = np.kron(layer, h)
            w = np.asarray(w, dtype=complex)
            norm = abs(w).sum()
            vectors = [layer @ part @ layer[:, 0] * weight / abs(weight) * norm / k
                       for weight, part in zip(w, parts)]
            chance = abs(w) / norm
            drawn = np.zeros(2 ** width)
            for draw in itertools.product(range(len(w)), repeat=k):
                amplitude = sum(vectors[i] for i in draw)
                drawn += np.prod(chance[list(draw)]) * abs(amplitude) ** 2
            law = laws(build)
            self.assertAlmostEqual(drawn.sum(), (k - 1 + law.extent) / k, 9)
            np.testing.assert_allclose(drawn / drawn.sum(), law.drawn(k), atol=1e-9)

    def test_published_mixtures(self):
        """h t h at k = 2, 5, 10, 100; h rz(1.1) h at k = 10. Recomputed values."""
        for build, terms, first in (
            (law_cases.one_t, 2, 0.797685892458), (law_cases.one_t, 5, 0.830094310254),
            (law_cases.one_t, 100, 0.852342265120), (law_cases.one_rotation, 10, 0.718626063367),
        ):
            self.assertAlmostEqual(laws(build).drawn(terms)[0], first, 9)


class Program(unittest.TestCase):
    """Drawn shots against the law."""

    def test_cases(self):
        for index, (name, case) in enumerate(CASES.items()):
            law = laws(case.build)
            for terms, readout in itertools.product(case.terms, case.readouts):
                with self.subTest(name, terms=terms, readout=readout):
                    self.check(law, terms, readout, seed=100 + index)

    def check(self, law, terms, readout, seed):
        """Drawn shots, companion shots and the recorded extent."""
        drawn = law.drawn(terms)
        self.assertGreater(fit.distinguishing_power(drawn, law.ideal, SHOTS), SHARP)
        out = program.run(law.circuit, SHOTS, seed=seed, readout=readout, delta=DELTA,
                          terms=terms, companion=SHOTS)
        self.assertAlmostEqual(out.attributes["extent"], law.extent, 8)
        self.assertEqual(out.attributes["terms"], terms)
        self.assertGreater(fit.fit_p_value(out.counts(companion=True), law.companion),
                           fit.FALSE_ALARM, "companion shots")
        self.assertGreater(fit.fit_p_value(out.counts(), drawn), fit.FALSE_ALARM,
                           f"{out.counts() / SHOTS} for {drawn}")
        if law.trace == 1:
            self.assertAlmostEqual(out.attributes["mixing_weight"], law.share(terms), 8)

    def test_recorded_weight_counts_the_trace(self):
        """λ of the result file, by which averages are corrected, is that of the law
        with damping as well, up to the noise of an estimated trace."""
        for name, case in CASES.items():
            law = laws(case.build)
            if law.trace == 1:
                continue
            with self.subTest(name):
                terms = case.terms[0]
                out = program.run(law.circuit, SHOTS, seed=9, readout="walk", terms=terms,
                                  companion=SHOTS)
                self.assertAlmostEqual(out.attributes["mixing_weight"], law.share(terms),
                                       delta=0.01)

    def test_cases_drawn_exactly(self):
        """`dense` draws from P, λ = 0."""
        for index, (name, case) in enumerate(CASES.items()):
            with self.subTest(name):
                law = laws(case.build)
                out = program.run(law.circuit, SHOTS, seed=200 + index, readout="dense")
                self.assertEqual(out.attributes.get("mixing_weight", 0), 0)
                self.assertGreater(fit.fit_p_value(out.counts(), law.ideal), fit.FALSE_ALARM,
                                   f"{out.counts() / SHOTS} for {law.ideal}")

    def check_against_own_companion(self, circuit, readout, seed, shots):
        """The law with the companion's part taken from its own shots."""
        ideal = distribution(circuit)
        out = program.run(circuit, shots, seed=300 + seed, readout=readout,
                          delta=DELTA, terms=4, companion=shots)
        share = out.attributes["mixing_weight"]
        if share == 0:  # no magic is left: there is one law
            p_value = fit.fit_p_value(out.counts(), ideal)
        else:
            p_value = fit.mixture_p_value(out.counts(), out.counts(companion=True), ideal,
                                          share)
        self.assertGreater(p_value, fit.FALSE_ALARM)

    def test_random_circuits_with_their_own_companion(self):
        """Circuits with every gate and Pauli noise, all sites before the first
        measurement: the law of `probe` is exact. They are slow to probe: fewer
        shots."""
        for seed in range(5):
            with self.subTest(seed=seed):
                circuit = random_circuits.build(seed, qubits=3, calls=10, measured_early=0,
                                                damping=False, interrupted=False)
                self.check_against_own_companion(circuit, "probe", seed, 10_000)

    def test_random_circuits_walked(self):
        """The same with feedback and sites after measurements, where the law of
        `walk` is exact as well."""
        for seed in range(10):
            with self.subTest(seed=seed):
                circuit = random_circuits.build(seed, qubits=3, calls=14,
                                                measured_early=seed % 3, damping=False)
                self.check_against_own_companion(circuit, "walk", seed, SHOTS)

    def test_measurements_between_sites_do_not_add_error(self):
        """With sites after a measurement the law is not exact, but the companion's
        share must not exceed λ by more than 3 % of it: one-sided, 4.75 standard
        errors (1e-6), which here are about a tenth of λ."""
        shots = 10_000
        for seed in (2009, 2018, 2023, 2062):
            with self.subTest(seed=seed):
                circuit = random_circuits.build(
                    seed, qubits=3 + seed % 2, calls=6 + seed % 12,
                    measured_early=seed % 3, damping=False)
                ideal = distribution(circuit)
                out = program.run(circuit, shots, seed=seed, readout="probe", delta=0.1,
                                  terms=10, companion=40_000)
                companion = out.counts(companion=True)
                self.assertGreater(fit.total_variation(companion / companion.sum(), ideal), 0.1)
                share, error = fit.admixture(out.counts(), companion, ideal)
                self.assertLess(share, 1.03 * out.attributes["mixing_weight"] + 4.75 * error)

    def test_the_number_of_terms_follows_delta(self):
        """2λ ≤ δ asks for k ≥ ⌈1 + ξ(2/δ − 1)⌉; a part of δ may be left to the
        estimates, but no more than half. The shots follow the law at that k."""
        law = laws(law_cases.entangled_t)
        extent, delta, shots = law.extent, 0.2, 10_000
        out = program.run(law.circuit, shots, seed=77, readout="probe", delta=delta)
        share = out.attributes["mixing_weight"]
        self.assertLessEqual(2 * share, delta * (1 + 1e-9))
        terms = int(out.attributes["terms"])
        self.assertGreaterEqual(terms, np.ceil(1 + extent * (2 / delta - 1)))
        self.assertLessEqual(terms, np.ceil(1 + extent * (4 / delta - 1)))
        self.assertAlmostEqual(share, mixing_weight(extent, terms), 9)
        self.assertEqual(out.attributes["delta"], delta)
        self.assertGreater(fit.fit_p_value(out.counts(), law.drawn(terms)), fit.FALSE_ALARM)

    def test_known_axes_cost_nothing(self):
        """A t on a qubit in |0⟩ and a ccz with a known control change nothing, and
        must not add to the extent."""
        circuit = LawCircuit(False)
        q = circuit.qubits("q", 3)
        m = circuit.bits("m", 3)
        circuit.gate("t", q[0])
        circuit.gate("h", q[1])
        circuit.gate("h", q[2])
        circuit.gate("ccz", *q)
        circuit.gate("h", q[1])
        circuit.measure_all(q, m)
        out = program.run(circuit, 1000, seed=5, readout="probe", terms=2)
        self.assertAlmostEqual(out.attributes["extent"], 1.0, 12)
        self.assertGreater(fit.fit_p_value(out.counts(), distribution(circuit)),
                           fit.FALSE_ALARM)


if __name__ == "__main__":
    unittest.main()
