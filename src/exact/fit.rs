//! Do drawn values follow a law?
//!
//! Pearson's χ² with the rarest values pooled until every cell expects at least
//! [`SMALLEST_EXPECTED`] counts, cells − 1 degrees of freedom. A value of
//! probability 0 that was drawn rejects the law outright. (Common practice, no
//! source.)
//!
//! For the corrected distribution the difference
//!
//! x = n/N − λ·m/M − (1 − λ)·P
//!
//! of the counts n of N shots and m of M companion shots has mean 0 and, where
//! the shots follow q and the companion shots c, the covariance
//!
//! diag(q/N + λ²·c/M) − q·qᵀ/N − λ²·c·cᵀ/M,
//!
//! a diagonal matrix and two products, so that x·Σ⁻¹·x is a closed form (the
//! last cell is left out: the cells of x sum to 0). It is χ² of cells − 1
//! degrees of freedom.

use std::collections::{BTreeMap, BTreeSet};

use super::Law;
use super::tail::{chi_squared_tail, ln_gamma};

/// Fewest expected counts of a cell.
pub const SMALLEST_EXPECTED: f64 = 10.0;

/// How often each value was drawn.
#[derive(Debug, Clone, PartialEq, Eq, Default)]
pub struct Counts {
    by_value: BTreeMap<Vec<u64>, u64>,
    shots: u64,
}

impl Counts {
    /// Adds one drawn value.
    pub fn add(&mut self, value: &[u64]) {
        self.add_many(value, 1);
    }

    /// Adds a value drawn `times` times.
    pub fn add_many(&mut self, value: &[u64], times: u64) {
        self.shots += times;
        match self.by_value.get_mut(value) {
            Some(count) => *count += times,
            None => {
                self.by_value.insert(value.to_vec(), times);
            }
        }
    }

    /// Number of values drawn, equal ones included.
    pub fn shots(&self) -> u64 {
        self.shots
    }

    /// How often a value was drawn.
    pub fn count(&self, value: &[u64]) -> u64 {
        self.by_value.get(value).copied().unwrap_or(0)
    }

    /// Relative frequencies as a law; empty without shots.
    pub fn frequencies(&self) -> Law {
        let shots = self.shots as f64;
        let values = self.by_value.iter();
        Law::new(values.map(|(value, &count)| (value.clone(), count as f64 / shots)))
    }
}

/// The outcome of a test of fit.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Fit {
    /// χ².
    pub statistic: f64,
    /// Its degrees of freedom.
    pub degrees_of_freedom: usize,
    /// Chance of a statistic at least as large under the law; 0 where something
    /// impossible was drawn.
    pub p_value: f64,
    /// Shots with a value of probability 0.
    pub impossible: u64,
}

impl Fit {
    fn new(statistic: f64, cells: usize, impossible: u64) -> Self {
        let degrees_of_freedom = cells.saturating_sub(1);
        Fit {
            statistic,
            degrees_of_freedom,
            p_value: if impossible > 0 {
                0.0
            } else {
                chi_squared_tail(statistic, degrees_of_freedom)
            },
            impossible,
        }
    }
}

/// Shots with a value of probability 0 under a law.
fn impossible(counts: &Counts, law: &Law) -> u64 {
    let drawn = counts.by_value.iter();
    drawn
        .filter(|(value, _)| law.weight(value) == 0.0)
        .map(|(_, count)| count)
        .sum()
}

/// Whether values were drawn from a law whose weights sum to 1.
pub fn fit(counts: &Counts, law: &Law) -> Fit {
    let shots = counts.shots as f64;
    let mut cells: Vec<(f64, f64)> = law
        .iter()
        .map(|(value, weight)| (weight * shots, counts.count(value) as f64))
        .collect();
    cells.sort_by(|a, b| a.0.total_cmp(&b.0));
    let groups = pooled(&cells, |cell| cell.0 >= SMALLEST_EXPECTED);
    let statistic = groups
        .iter()
        .map(|&(expected, found)| (found - expected).powi(2) / expected)
        .sum();
    Fit::new(statistic, groups.len(), impossible(counts, law))
}

/// What can be added up over the values of a cell.
trait Cell: Copy {
    fn plus(self, other: Self) -> Self;
}

impl Cell for (f64, f64) {
    fn plus(self, other: Self) -> Self {
        (self.0 + other.0, self.1 + other.1)
    }
}

/// Cells in an order of growing weight, joined from the lightest on until each
/// is large enough; what is left too small joins the last one.
fn pooled<C: Cell>(cells: &[C], large: impl Fn(&C) -> bool) -> Vec<C> {
    let mut groups: Vec<C> = Vec::new();
    let mut open: Option<C> = None;
    for &cell in cells {
        let sum = open.map_or(cell, |open| open.plus(cell));
        if large(&sum) {
            groups.push(sum);
            open = None;
        } else {
            open = Some(sum);
        }
    }
    if let Some(rest) = open {
        match groups.pop() {
            Some(last) => groups.push(last.plus(rest)),
            None => groups.push(rest),
        }
    }
    groups
}

/// How far a corrected distribution is from the ideal one.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct CorrectedFit {
    /// The test over all cells.
    pub fit: Fit,
    /// Total variation distance of the corrected frequencies to the ideal law,
    /// over the values that can happen.
    pub distance: f64,
    /// What statistics alone make of that distance, about.
    pub statistical: f64,
    /// Largest deviation of a cell in standard errors.
    pub largest_deviation: f64,
}

/// One value, or some of them together.
#[derive(Debug, Clone, Copy)]
struct Mixture {
    /// n/N − λ·m/M − (1 − λ)·P.
    difference: f64,
    /// Weight under the law of the shots and under that of the companion.
    shots: f64,
    companion: f64,
}

impl Cell for Mixture {
    fn plus(self, other: Self) -> Self {
        Mixture {
            difference: self.difference + other.difference,
            shots: self.shots + other.shots,
            companion: self.companion + other.companion,
        }
    }
}

/// Whether the corrected distribution is the ideal one, given that the laws of
/// shots and companion shots are (1 − λ)·`ideal` + λ·`companion` and
/// `companion`. λ = `mixing_weight` lies between 0 and 1 (exclusive). `None`
/// without shots of either kind.
pub fn corrected_fit(
    counts: &Counts,
    companion_counts: &Counts,
    ideal: &Law,
    companion: &Law,
    mixing_weight: f64,
) -> Option<CorrectedFit> {
    let (shots, others) = (counts.shots as f64, companion_counts.shots as f64);
    if !(shots > 0.0 && others > 0.0 && mixing_weight > 0.0 && mixing_weight < 1.0) {
        return None;
    }
    let (lambda, rest) = (mixing_weight, 1.0 - mixing_weight);
    let law = ideal.mixed(companion, lambda);
    let values: BTreeSet<&[u64]> = ideal.iter().chain(companion.iter()).map(|v| v.0).collect();
    let mut cells: Vec<Mixture> = values
        .into_iter()
        .map(|value| Mixture {
            difference: counts.count(value) as f64 / shots
                - lambda * companion_counts.count(value) as f64 / others
                - rest * ideal.weight(value),
            shots: law.weight(value),
            companion: companion.weight(value),
        })
        .collect();
    let variance = |cell: &Mixture| {
        let of = |weight: f64| weight * (1.0 - weight).max(0.0);
        of(cell.shots) / shots + lambda * lambda * of(cell.companion) / others
    };
    let distance = cells.iter().map(|cell| cell.difference.abs()).sum::<f64>() / (2.0 * rest);
    // E|x| of a normal law is √(2/π) of its standard deviation.
    let spread: f64 = cells.iter().map(|cell| variance(cell).sqrt()).sum();
    let statistical = spread * std::f64::consts::FRAC_2_PI.sqrt() / (2.0 * rest);

    let size = |cell: &Mixture| (cell.shots * shots).min(cell.companion * others);
    cells.sort_by(|a, b| size(a).total_cmp(&size(b)));
    // A cell the companion hardly ever shows is as good as a plain count.
    let large = |cell: &Mixture| {
        let noise = lambda * lambda * cell.companion / others;
        cell.shots * shots >= SMALLEST_EXPECTED
            && (cell.companion * others >= SMALLEST_EXPECTED || noise < 0.01 * cell.shots / shots)
    };
    let groups = pooled(&cells, large);
    let largest_deviation = groups
        .iter()
        .map(|cell| cell.difference.abs() / variance(cell).sqrt().max(f64::MIN_POSITIVE))
        .filter(|_| groups.len() > 1)
        .fold(0.0, f64::max);
    let statistic = quadratic_form(&groups[..groups.len() - 1], shots, others, lambda);
    let impossible = impossible(counts, &law) + impossible(companion_counts, companion);
    Some(CorrectedFit {
        fit: Fit::new(statistic, groups.len(), impossible),
        distance,
        statistical,
        largest_deviation,
    })
}

/// x·Σ⁻¹·x with Σ = D − U·Uᵀ: x·D⁻¹·x + (x·D⁻¹·U)·(1 − UᵀD⁻¹U)⁻¹·(UᵀD⁻¹x).
fn quadratic_form(cells: &[Mixture], shots: f64, others: f64, lambda: f64) -> f64 {
    let (mut plain, mut linear, mut inner) = (0.0, [0.0; 2], [[0.0; 2]; 2]);
    for cell in cells {
        let diagonal = cell.shots / shots + lambda * lambda * cell.companion / others;
        if diagonal <= 0.0 {
            continue;
        }
        let factors = [
            cell.shots / shots.sqrt(),
            lambda * cell.companion / others.sqrt(),
        ];
        plain += cell.difference.powi(2) / diagonal;
        for i in 0..2 {
            linear[i] += cell.difference * factors[i] / diagonal;
            for j in 0..2 {
                inner[i][j] += factors[i] * factors[j] / diagonal;
            }
        }
    }
    let (a, b, d) = (1.0 - inner[0][0], -inner[0][1], 1.0 - inner[1][1]);
    let determinant = a * d - b * b;
    if determinant <= 0.0 {
        return plain;
    }
    let [u, v] = linear;
    plain + (d * u * u - 2.0 * b * u * v + a * v * v) / determinant
}

/// Mean total variation distance between the frequencies of `shots` draws and
/// the law they come from: half the sum of the mean absolute deviations of
/// binomial laws, each exactly 2ν(1−p)·C(N,ν)·p^ν·(1−p)^(N−ν)/N with ν = ⌊Np⌋+1
/// (textbook, from memory).
pub fn expected_distance(law: &Law, shots: u64) -> f64 {
    if shots == 0 {
        return 0.0;
    }
    0.5 * law
        .iter()
        .map(|(_, weight)| mean_absolute_deviation(weight, shots as f64))
        .sum::<f64>()
}

fn mean_absolute_deviation(p: f64, shots: f64) -> f64 {
    if p <= 0.0 || p >= 1.0 {
        return 0.0;
    }
    let nu = ((shots * p).floor() + 1.0).min(shots);
    let binomial = ln_gamma(shots + 1.0) - ln_gamma(nu + 1.0) - ln_gamma(shots - nu + 1.0);
    let log = binomial + nu * p.ln() + (shots - nu) * (-p).ln_1p();
    2.0 * nu * (1.0 - p) * log.exp() / shots
}

#[cfg(test)]
mod tests {
    use rand::{Rng, RngExt, SeedableRng};
    use rand_pcg::Pcg64;

    use super::*;

    fn law(weights: &[f64]) -> Law {
        Law::new(
            (0..)
                .zip(weights)
                .map(|(value, &weight)| (vec![value], weight)),
        )
    }

    fn draw(law: &Law, shots: u64, rng: &mut impl Rng) -> Counts {
        let weights: Vec<(&[u64], f64)> = law.iter().collect();
        let mut counts = Counts::default();
        for _ in 0..shots {
            let mut left = rng.random::<f64>() * law.total();
            let mut chosen = weights[0].0;
            for &(value, weight) in &weights {
                chosen = value;
                left -= weight;
                if left < 0.0 {
                    break;
                }
            }
            counts.add(chosen);
        }
        counts
    }

    /// Mean distance of frequencies to a uniform law of d values: exact mean
    /// absolute deviations, common practice, no source.
    #[test]
    fn statistical_part_of_a_distance() {
        for (values, shots, expected) in [
            (2, 1000, 0.01261251),
            (16, 10_000, 0.01544890),
            (64, 10_000, 0.03166746),
        ] {
            let found =
                expected_distance(&law(&vec![1.0 / f64::from(values); values as usize]), shots);
            assert!((found - expected).abs() < 1e-8, "{found}");
        }
        // One shot of a fair coin is off by a half, of three it is 1/4 on the mean:
        // (2·1/2 + 6·1/6)/8.
        assert!((expected_distance(&law(&[0.5, 0.5]), 1) - 0.5).abs() < 1e-12);
        assert!((expected_distance(&law(&[0.5, 0.5]), 3) - 0.25).abs() < 1e-12);
        assert_eq!(expected_distance(&law(&[1.0]), 10), 0.0);
    }

    /// By hand: 60, 30, 10 of 100 at 1/2, 3/10, 1/5: 2 + 0 + 5 = 7, two degrees
    /// of freedom, e^{−7/2}.
    #[test]
    fn pearson_by_hand() {
        let mut counts = Counts::default();
        for (value, count) in [(0u64, 60), (1, 30), (2, 10)] {
            (0..count).for_each(|_| counts.add(&[value]));
        }
        let found = fit(&counts, &law(&[0.5, 0.3, 0.2]));
        assert!((found.statistic - 7.0).abs() < 1e-12);
        assert_eq!(found.degrees_of_freedom, 2);
        assert!((found.p_value - (-3.5f64).exp()).abs() < 1e-12);
        // The same with value 2 impossible: rejected, whatever the statistic.
        let found = fit(&counts, &law(&[0.6, 0.4]));
        assert_eq!((found.impossible, found.p_value), (10, 0.0));
        // A certain value leaves nothing to test.
        let mut certain = Counts::default();
        certain.add(&[0]);
        assert_eq!(fit(&certain, &law(&[1.0])).p_value, 1.0);
    }

    /// p-values are uniform under the law: of 2,000 repetitions 10 % lie below
    /// 0.1, with 6 standard deviations (0.04) of allowance, false alarm 2e-9
    /// (normal law). Both tests; rare values are pooled.
    #[test]
    fn p_values_are_uniform_under_the_law() {
        let mut rng = Pcg64::seed_from_u64(1);
        let ideal = law(&[0.5, 0.2, 0.2, 0.05, 0.03, 0.0, 0.015, 0.004, 0.001]);
        let companion = law(&[0.25, 0.25, 0.1, 0.1, 0.1, 0.1, 0.05, 0.05]);
        let weight = 0.3;
        let mixed = ideal.mixed(&companion, weight);
        let (mut plain, mut corrected) = (0, 0);
        let repetitions = 2000;
        for _ in 0..repetitions {
            let shots = draw(&mixed, 2000, &mut rng);
            let others = draw(&companion, 700, &mut rng);
            plain += u32::from(fit(&shots, &mixed).p_value < 0.1);
            let found = corrected_fit(&shots, &others, &ideal, &companion, weight).unwrap();
            corrected += u32::from(found.fit.p_value < 0.1);
        }
        for hits in [plain, corrected] {
            let share = f64::from(hits) / f64::from(repetitions);
            assert!((share - 0.1).abs() < 0.04, "{share}");
        }
    }

    /// A histogram drawn with another number of terms is rejected, by both
    /// tests. ξ = 3, k = 4 and 5: λ = 1/2 and 3/7.
    #[test]
    fn a_wrong_law_is_rejected() {
        let mut rng = Pcg64::seed_from_u64(2);
        let (ideal, companion) = (law(&[0.9, 0.1, 0.0]), law(&[0.5, 0.3, 0.2]));
        let (right, wrong) = (0.5, 3.0 / 7.0);
        let shots = draw(&ideal.mixed(&companion, right), 40_000, &mut rng);
        let others = draw(&companion, 40_000, &mut rng);
        for (weight, accepted) in [(right, true), (wrong, false)] {
            let found = fit(&shots, &ideal.mixed(&companion, weight));
            assert_eq!(found.p_value > 1e-6, accepted, "{found:?}");
            let found = corrected_fit(&shots, &others, &ideal, &companion, weight).unwrap();
            assert_eq!(found.fit.p_value > 1e-6, accepted, "{found:?}");
        }
    }
}
