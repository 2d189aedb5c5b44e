"""The tests for drawn bits are themselves tested on synthetic draws.

Checked: false alarms come at the stated rate, an error of 1 % total variation
is caught, impossible outcomes fail at once, published chi-squared points.
Limits on false-alarm counts below are exact binomial quantiles at 1e-6.
"""

import unittest

import numpy as np
from scipy import stats

import goodness_of_fit as fit


def laws(seed):
    """Laws of several sizes, some with rare bins."""
    random = np.random.default_rng(seed)
    yield np.array([0.5, 0.5])
    yield np.array([0.853553390593, 0.146446609407])
    yield np.array([0.9999, 0.0001])
    yield random.dirichlet(np.ones(16))
    yield random.dirichlet(np.full(64, 0.3))


class PublishedPoints(unittest.TestCase):
    def test_upper_points_of_chi_squared(self):
        """Upper points as tabulated in statistics textbooks (recomputed)."""
        for freedom, level, point in ((1, 0.05, 3.84145882), (1, 1e-4, 15.13670523),
                                      (7, 0.01, 18.47530691), (31, 1e-4, 69.10569229)):
            # Two bins or more whose Pearson statistic is that point.
            self.assertAlmostEqual(stats.chi2.isf(level, freedom), point, 6)

    def test_exact_binomial(self):
        """Two-sided tail of 8 of 10 fair coins: 2·56/1024. Arithmetic."""
        self.assertAlmostEqual(fit.binomial_p_value(8, 10, 0.5), 112 / 1024, 12)

    def test_pearson_by_hand(self):
        """60 of 100 fair coins: (10² + 10²)/50 = 4, upper tail 0.0455002639."""
        self.assertAlmostEqual(fit.fit_p_value([60, 40], [0.5, 0.5]), 0.0455002639, 9)


class Pooling(unittest.TestCase):
    def test_every_group_expects_enough(self):
        for law in laws(3):
            for shots in (30, 1000, 100_000):
                groups = fit.pool(law, shots)
                expected = shots * fit.grouped(law, groups)
                if len(expected) > 1:
                    self.assertGreaterEqual(expected.min(), 10)
                self.assertAlmostEqual(expected.sum(), shots, 6)

    def test_impossible_outcome_fails(self):
        self.assertEqual(fit.fit_p_value([500, 499, 1], [0.5, 0.5, 0.0]), 0.0)
        self.assertEqual(fit.fit_p_value([999, 1], [1.0, 0.0]), 0.0)

    def test_certain_outcome_passes(self):
        self.assertEqual(fit.fit_p_value([1000, 0], [1.0, 0.0]), 1.0)


class FalseAlarms(unittest.TestCase):
    """At level 1e-2, 4,000 tests may alarm at most as often as a binomial does."""

    LEVEL, TESTS = 1e-2, 4000

    def check(self, p_values):
        alarms = sum(p < self.LEVEL for p in p_values)
        self.assertLessEqual(alarms, stats.binom.isf(1e-6, self.TESTS, 1.15 * self.LEVEL))
        # And the p-values are not all near 1.
        self.assertGreaterEqual(alarms, stats.binom.ppf(1e-6, self.TESTS, 0.5 * self.LEVEL))

    def test_fit(self):
        random = np.random.default_rng(11)
        for law in list(laws(5))[:2] + list(laws(5))[3:]:
            draws = random.multinomial(20_000, law, size=self.TESTS)
            self.check([fit.fit_p_value(d, law) for d in draws])

    def test_mixture(self):
        random = np.random.default_rng(12)
        ideal, companion = random.dirichlet(np.ones(8)), random.dirichlet(np.ones(8))
        out = 0.6 * ideal + 0.4 * companion
        first = random.multinomial(20_000, out, size=self.TESTS)
        second = random.multinomial(20_000, companion, size=self.TESTS)
        self.check([fit.mixture_p_value(a, b, ideal, 0.4) for a, b in zip(first, second)])

    def test_same_law(self):
        random = np.random.default_rng(13)
        law = random.dirichlet(np.ones(8))
        draws = random.multinomial(5_000, law, size=2 * self.TESTS)
        self.check([fit.same_law_p_value(a, b) for a, b in zip(draws[::2], draws[1::2])])


class Power(unittest.TestCase):
    """An error of 1 % total variation is caught in at least 98 of 100 draws."""

    def test_catches_one_percent(self):
        random = np.random.default_rng(21)
        for law in (np.array([0.7, 0.3]), random.dirichlet(np.full(16, 2.0))):
            shots = fit.shots_needed(len(law))
            wrong = law.copy()
            order = np.argsort(law)
            wrong[order[-1]] -= 0.01
            wrong[order[0]] += 0.01
            self.assertAlmostEqual(fit.total_variation(law, wrong), 0.01, 12)
            draws = random.multinomial(shots, wrong, size=100)
            caught = sum(fit.fit_p_value(d, law) < fit.FALSE_ALARM for d in draws)
            self.assertGreaterEqual(caught, 98)

    def test_mixture_catches_the_missing_companion(self):
        random = np.random.default_rng(22)
        ideal, companion = random.dirichlet(np.ones(8)), random.dirichlet(np.ones(8))
        counts = random.multinomial(50_000, ideal)
        companions = random.multinomial(50_000, companion)
        self.assertLess(fit.mixture_p_value(counts, companions, ideal, 0.3), fit.FALSE_ALARM)

    def test_admixture(self):
        """The share is found, with the stated standard error."""
        random = np.random.default_rng(23)
        ideal, companion = random.dirichlet(np.ones(8)), random.dirichlet(np.ones(8))
        pulls = []
        for _ in range(400):
            counts = random.multinomial(20_000, 0.7 * ideal + 0.3 * companion)
            companions = random.multinomial(20_000, companion)
            share, error = fit.admixture(counts, companions, ideal)
            pulls.append((share - 0.3) / error)
        # Mean and spread of 400 standard normals, at 1e-6.
        self.assertLess(abs(np.mean(pulls)), 4.9 / np.sqrt(400))
        self.assertLess(abs(np.std(pulls) - 1), 4.9 / np.sqrt(800))

    def test_mixture_catches_impossible_outcomes(self):
        counts, companions = np.array([900, 80, 20]), np.array([700, 300, 0])
        ideal = np.array([1.0, 0.0, 0.0])
        self.assertLess(fit.mixture_p_value(counts, companions, ideal, 0.3), fit.FALSE_ALARM)


if __name__ == "__main__":
    unittest.main()
