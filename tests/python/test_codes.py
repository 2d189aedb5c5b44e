"""Codes and distillation against published counts and formulas.

Exact two-sided binomial tests at 1e-6. Codes: 200,000 shots, an error of 0.6
percentage points in P(trivial syndrome) is caught. Distillation: 200,000 shots,
an error of 0.6 percentage points in the accepted fraction is caught, and of the
conditional error about 7 standard deviations (at p = 0.05, 15-to-1: 0.17 points).
"""

import unittest

import numpy as np

import code_circuits as codes
import goodness_of_fit as fit
import program
from reference import distribution

SHOTS = 200_000
NOISE = 0.05


class Formulas(unittest.TestCase):
    def test_enumerators(self):
        """The published lists, by listing every stabiliser and normaliser element."""
        for name, (a, b) in codes.ENUMERATORS.items():
            stabilisers, _ = codes.CODES[name]
            self.assertEqual(codes.stabiliser_enumerator(stabilisers), a, name)
            self.assertEqual(codes.normaliser_enumerator(stabilisers), b, name)

    def test_reference_gives_the_enumerator_sum(self):
        for name in ("four", "five"):
            law = distribution(codes.code_memory(name, NOISE, False))
            self.assertAlmostEqual(
                law[0], codes.enumerator_sum(codes.ENUMERATORS[name][1], NOISE), 12)

    def test_distillation_formulas_give_the_published_digits(self):
        for (name, p), published in codes.PUBLISHED.items():
            _, accept, error = codes.DISTILLATION[name][0](p)
            np.testing.assert_allclose((accept, error), published, rtol=1e-9)

    def test_reference_gives_the_distillation_formulas(self):
        for name, p in codes.PUBLISHED:
            build, checks = codes.DISTILLATION[name]
            circuit, accept, error = build(p)
            np.testing.assert_allclose(
                codes.accepted_and_wrong(distribution(circuit), checks), (accept, error),
                rtol=1e-9)


class Program(unittest.TestCase):
    def binomial(self, successes, trials, probability):
        self.assertGreater(fit.binomial_p_value(successes, trials, probability),
                           fit.FALSE_ALARM,
                           f"{successes} of {trials}, expected {probability * trials:.1f}")

    def test_trivial_syndrome(self):
        for seed, (name, (a, b)) in enumerate(codes.ENUMERATORS.items()):
            with self.subTest(name):
                logical = name != "four"
                circuit = codes.code_memory(name, NOISE, logical)
                out = program.run(circuit, SHOTS, seed=40 + seed)
                trivial = ~out.shots["syndrome"].any(axis=1)
                self.binomial(trivial.sum(), SHOTS, codes.enumerator_sum(b, NOISE))
                if logical:
                    right = trivial & ~out.shots["error"].any(axis=1)
                    self.binomial(right.sum(), SHOTS, codes.enumerator_sum(a, NOISE))

    def test_without_noise_every_check_is_zero(self):
        for name in codes.ENUMERATORS:
            circuit = codes.code_memory(name, 0.0, name != "four")
            out = program.run(circuit, 2000, seed=50)
            self.assertFalse(out.shots["syndrome"].any())
            if "error" in out.shots:
                self.assertFalse(out.shots["error"].any())

    def test_distillation(self):
        for seed, (name, p) in enumerate(codes.PUBLISHED):
            with self.subTest(name, p=p):
                build, checks = codes.DISTILLATION[name]
                circuit, accept, error = build(p)
                out = program.run(circuit, SHOTS, seed=60 + seed)
                accepted = ~out.shots["rejected"].any(axis=1)
                self.binomial(accepted.sum(), SHOTS, accept)
                wrong = out.shots["wrong"][accepted].any(axis=1)
                self.binomial(wrong.sum(), accepted.sum(), error)


if __name__ == "__main__":
    unittest.main()
