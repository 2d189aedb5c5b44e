"""Goodness-of-fit tests for drawn bits.

A test fails when its p-value is below `FALSE_ALARM` = 1e-6; with fixed seeds a
pass stays a pass. `shots_needed` says how many shots make a test catch a total
variation error of 1 % with probability 0.99 (noncentral chi-squared: an error
of that size shifts the statistic by at least 4·N·distance²).

Bins with an expected count below 10 are pooled. A bin of probability zero must
be empty: one shot in it fails the test at once.

Source: Pearson's chi-squared and the exact binomial test, textbook; common
practice, no source, for the pooling limit.
"""

import numpy as np
from scipy import stats

FALSE_ALARM = 1e-6
IMPOSSIBLE = 1e-12
SMALLEST_EXPECTED = 10.0


def pool(probabilities, shots):
    """Group number of every possible bin (-1: impossible) so that every group
    expects at least `SMALLEST_EXPECTED`; rare bins share one group."""
    groups = np.full(len(probabilities), -1)
    possible = np.flatnonzero(probabilities > IMPOSSIBLE)
    order = possible[np.argsort(probabilities[possible], kind="stable")]
    expected = shots * probabilities[order]
    first_large = np.searchsorted(expected, SMALLEST_EXPECTED)
    pooled = expected[:first_large].sum()
    while 0 < first_large < len(order) and pooled < SMALLEST_EXPECTED:
        pooled += expected[first_large]
        first_large += 1
    start = 1 if first_large else 0
    groups[order[:first_large]] = 0
    groups[order[first_large:]] = start + np.arange(len(order) - first_large)
    return groups


def grouped(values, groups):
    """Sums of the values over the groups."""
    kept = groups >= 0
    return np.bincount(groups[kept], weights=values[kept])


def fit_p_value(counts, probabilities):
    """p-value of the counts under the probabilities (Pearson)."""
    counts, probabilities = np.asarray(counts), np.asarray(probabilities, dtype=float)
    if abs(probabilities.sum() - 1) > 1e-9:
        raise ValueError(f"probabilities sum to {probabilities.sum()!r}, not to 1")
    shots = counts.sum()
    groups = pool(probabilities, shots)
    if counts[groups < 0].any():
        return 0.0
    observed = grouped(counts, groups)
    expected = shots * grouped(probabilities, groups)
    if len(observed) < 2:
        return 1.0
    return float(stats.chi2.sf(((observed - expected) ** 2 / expected).sum(),
                               len(observed) - 1))


def mixture_p_value(counts, companion_counts, ideal, mixing_weight):
    """p-value of the mixing law where the companion's law is known only by its
    own shots: counts ~ (1 − λ)·ideal + λ·C, companion_counts ~ C, C free.

    The difference n/N − λ·m/M − (1 − λ)·ideal has mean zero and a known
    covariance, which gives a chi-squared of (groups − 1) degrees of freedom. The
    covariance is taken at the law estimated from both sets of shots.
    """
    counts, companion_counts = np.asarray(counts), np.asarray(companion_counts)
    shots, companions = counts.sum(), companion_counts.sum()
    ideal = np.asarray(ideal, dtype=float)
    rest = (1 - mixing_weight) * ideal
    law = (counts / shots + rest + mixing_weight * companion_counts / companions) / 2
    groups = pool(law, min(shots, companions))
    law, rest = grouped(law, groups), grouped(rest, groups)
    difference = grouped(counts, groups) / shots - rest
    difference -= mixing_weight * grouped(companion_counts, groups) / companions
    if len(law) < 2:
        return 1.0
    companion_law = ((law - rest) / mixing_weight).clip(0)
    companion_law /= companion_law.sum()
    covariance = multinomial_covariance(law) / shots
    covariance += mixing_weight ** 2 * multinomial_covariance(companion_law) / companions
    statistic = difference[:-1] @ np.linalg.solve(covariance[:-1, :-1], difference[:-1])
    return float(stats.chi2.sf(statistic, len(law) - 1))


def admixture(counts, companion_counts, ideal):
    """(share, standard error) of the companion's law in the law of the counts:
    least squares of n/N = ideal + share·(companion − ideal)."""
    counts, companion_counts = np.asarray(counts), np.asarray(companion_counts)
    shots, companions = counts.sum(), companion_counts.sum()
    drawn, companion = counts / shots, companion_counts / companions
    direction = (companion - ideal) / ((companion - ideal) ** 2).sum()
    share = (drawn - ideal) @ direction
    variance = direction @ multinomial_covariance(drawn) @ direction / shots
    variance += share ** 2 * (direction @ multinomial_covariance(companion) @ direction
                              ) / companions
    return float(share), float(np.sqrt(variance))


def multinomial_covariance(probabilities):
    """Covariance of one draw's indicator vector."""
    return np.diag(probabilities) - np.outer(probabilities, probabilities)


def same_law_p_value(first, second):
    """p-value that two sets of counts come from one law (homogeneity test)."""
    table = np.array([first, second], dtype=float)
    table = table[:, table.sum(axis=0) > 0]
    share = table.sum(axis=0) / table.sum()
    groups = pool(share, table.sum(axis=1).min())
    table = np.array([grouped(row, groups) for row in table])
    if table.shape[1] < 2:
        return 1.0
    return float(stats.chi2_contingency(table, correction=False).pvalue)


def binomial_p_value(successes, trials, probability):
    """Exact two-sided binomial test."""
    return float(stats.binomtest(int(successes), int(trials), float(probability)).pvalue)


def power(bins, shots, distance, false_alarm=FALSE_ALARM):
    """Chance to catch an error of that total variation distance, at least."""
    freedom = max(bins - 1, 1)
    critical = stats.chi2.isf(false_alarm, freedom)
    return float(stats.ncx2.sf(critical, freedom, 4 * shots * distance ** 2))


def shots_needed(bins, distance=0.01, wanted=0.99):
    """Least number of shots, to the next thousand, with that power."""
    low, high = 1, 1
    while power(bins, 1000 * high, distance) < wanted:
        high *= 2
    while low < high:
        middle = (low + high) // 2
        if power(bins, 1000 * middle, distance) < wanted:
            low = middle + 1
        else:
            high = middle
    return 1000 * high


def total_variation(first, second):
    """Total variation distance of two laws."""
    return float(np.abs(np.asarray(first) - np.asarray(second)).sum() / 2)


def distinguishing_power(law, other, shots, false_alarm=FALSE_ALARM):
    """Chance that shots of `law` are told from `other` by `fit_p_value`."""
    groups = pool(other, shots)
    if law[groups < 0].sum() * shots > 20:
        return 1.0
    p, q = grouped(law, groups), grouped(other, groups)
    shift = shots * ((p - q) ** 2 / q).sum()
    freedom = max(len(q) - 1, 1)
    return float(stats.ncx2.sf(stats.chi2.isf(false_alarm, freedom), freedom, shift))
