"""Distillation by sampled terms, corrected with companion shots.

The number of terms is so small that a third or so of the shots are the
companion's: the shots as drawn miss the published figures by far, the corrected
averages must not. Corrected is P = (P_out − λ·P_comp)/(1 − λ), PRX Quantum 2,
010345 (2021), from memory; published figures and their sources are in
code_circuits.py. Accepted shots are counted by the program's own summary as
well. Two-sided tests at 1e-6 (4.89 standard errors).
"""

import json
import unittest

import numpy as np

import code_circuits as codes
import program

SHOTS = 50_000
DEVIATIONS = 4.8916  # two-sided normal, 1e-6
VISIBLE = 8

# (protocol, parameter p of the circuit): number of terms.
CASES = {
    ("15-to-1", 0.001): 20,
    ("15-to-1", 0.01): 20,
    ("15-to-1", 0.05): 10,
    ("15-to-1", 0.1): 4,
    ("8T-to-CCZ", 0.001): 12,
    ("8T-to-CCZ", 0.01): 12,
    ("8T-to-CCZ", 0.05): 6,
    ("5-to-1", 0.0015): 8,
    ("5-to-1", 0.015): 8,
    ("5-to-1", 0.075): 6,
    ("5-to-1", 0.15): 4,
}
# Below this expected number of wrong shots, wrong outputs are not seen as drawn.
COUNTABLE = 100


class Average:
    """An average with its variance, as drawn and corrected."""

    def __init__(self, shots, companion, share):
        drawn, other = shots.mean(), companion.mean()
        self.raw, self.raw_error = drawn, spread(shots)
        self.value = (drawn - share * other) / (1 - share)
        self.error = np.hypot(spread(shots), share * spread(companion)) / (1 - share)


def spread(values):
    """Standard error of a mean; at least that of one event."""
    return max(values.std(), 1 / np.sqrt(len(values))) / np.sqrt(len(values))


def accepted_and_wrong(tables):
    """Per shot: accepted; accepted and wrong."""
    accepted = ~tables["rejected"].any(axis=1)
    return accepted, accepted & tables["wrong"].any(axis=1)


class Published(unittest.TestCase):
    """The formulas behind the figures that test_codes.py does not list."""

    def test_smallest_noise(self):
        for name, p, published in (
            ("15-to-1", 0.001, (0.985104581048, 3.510537795740e-08)),
            ("8T-to-CCZ", 0.001, (0.992055776559, 2.805535321e-05)),
            ("5-to-1", 0.0015, (0.165835830002, 5.009989896e-06)),
            ("5-to-1", 0.015, (0.158580016667, 5.098893818e-04)),
        ):
            _, accept, error = codes.DISTILLATION[name][0](p)
            self.assertAlmostEqual(accept, published[0], 11)
            self.assertAlmostEqual(error / published[1], 1, 6)


class Corrected(unittest.TestCase):
    def test_distillation(self):
        for seed, ((name, p), terms) in enumerate(CASES.items()):
            with self.subTest(name, p=p):
                circuit, accept, error = codes.DISTILLATION[name][0](p)
                out = program.run(circuit, SHOTS, seed=600 + seed, readout="walk",
                                  terms=terms, companion=SHOTS, extra=["--json"],
                                  quiet=False)
                self.check(out, accept, error)

    def check(self, out, accept, error):
        """Accepted fraction and conditional error, as drawn and corrected."""
        share = out.attributes["mixing_weight"]
        accepted, wrong = accepted_and_wrong(out.shots)
        companion_accepted, companion_wrong = accepted_and_wrong(out.companion)
        acceptance = Average(accepted, companion_accepted, share)
        self.assertGreater(abs(acceptance.raw - accept), VISIBLE * acceptance.raw_error)
        self.assertLess(abs(acceptance.value - accept), DEVIATIONS * acceptance.error)
        # P(wrong | accepted) = e exactly where the mean of this is 0.
        excess = Average(wrong - error * accepted, companion_wrong - error * companion_accepted,
                         share)
        self.assertLess(abs(excess.value), DEVIATIONS * excess.error)
        if error * accept * SHOTS > COUNTABLE:
            self.assertGreater(abs(excess.raw), VISIBLE * excess.raw_error)
        self.check_summary(out, accept)

    def check_summary(self, out, accept):
        """The program's own corrected frequency and its standard error."""
        rejected = next(register for register in json.loads(out.stdout)["registers"]
                        if register["name"] == "rejected")
        corrected = rejected["any_nonzero"]["corrected"]
        self.assertLess(abs(1 - corrected["value"] - accept),
                        DEVIATIONS * corrected["standard_error"])


if __name__ == "__main__":
    unittest.main()
