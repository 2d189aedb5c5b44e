//! The law of the drawn terms, by summing over all draws and by sampling.
//!
//! E[ΩΩ†] = (1 − 1/k)·ψψ† + (ξ/k)·σ and P_out = [(k−1)P + ξP_companion]/(k−1+ξ):
//! one line of algebra from independent draws with chance |c|/Σ|c|; the same
//! construction is in PRX Quantum 2, 010345 (2021), from memory.

use std::collections::VecDeque;
use std::convert::Infallible;
use std::f64::consts::{FRAC_1_SQRT_2, FRAC_PI_4};

use rand::{SeedableRng, TryRng};
use rand_pcg::Pcg64;

use super::super::mixing;
use super::super::site::{PreparedSite, RotationSite};
use super::*;

type Vector = Vec<Complex64>;

fn rotation(angle: f64, dephasing: f64) -> Site {
    let site = RotationSite::new(angle, dephasing);
    let extent = site.extent_without_noise();
    Site::new(SiteKind::Rotation(site), 0, vec![0], extent)
}

fn prepared(bloch: [f64; 3]) -> Site {
    let site = PreparedSite::new(bloch);
    let extent = site.extent();
    Site::new(SiteKind::Prepared(site), 0, vec![0], extent)
}

fn ccz() -> Site {
    Site::new(SiteKind::Ccz(CczSite), 0, vec![0, 1, 2], CczSite::EXTENT)
}

/// The state a component makes of a site: of a prepared qubit the state itself,
/// of a gate its diagonal on |+⟩ or |+++⟩.
fn component_state(site: &Site, member: u16, component: u8) -> Vector {
    let plus = Complex64::new(FRAC_1_SQRT_2, 0.0);
    match &site.kind {
        SiteKind::Rotation(_) => vec![plus, plus * Complex64::i().powi(component.into())],
        SiteKind::Prepared(state) => {
            let (stabiliser, _) =
                state.members[usize::from(member)].components[usize::from(component)];
            stabiliser.amplitudes().to_vec()
        }
        SiteKind::Ccz(_) => {
            let diagonal = CczSite::component(component);
            let sign = |x| {
                if diagonal.is_negative_at(x) {
                    -1.0
                } else {
                    1.0
                }
            };
            (0..8).map(|x| plus.powi(3) * sign(x)).collect()
        }
    }
}

fn tensor(a: &Vector, b: &Vector) -> Vector {
    b.iter()
        .flat_map(|y| a.iter().map(move |x| x * y))
        .collect()
}

/// Ω = Σ_j weight_j φ_j, all sites side by side.
fn sum_of_terms(sites: &[Site], draw: &Draw) -> Vector {
    let mut sum = Vec::new();
    for term in 0..draw.terms {
        let mut state = vec![draw.weight(sites, term)];
        for (index, site) in sites.iter().enumerate() {
            let part = component_state(site, draw.members[index], draw.component(index, term));
            state = tensor(&state, &part);
        }
        sum.resize(state.len(), Complex64::new(0.0, 0.0));
        for (total, amplitude) in sum.iter_mut().zip(state) {
            *total += amplitude;
        }
    }
    sum
}

/// A density operator, or any Hermitian matrix, row by row.
#[derive(Clone)]
struct Operator(Vec<Vector>);

impl Operator {
    fn zero(size: usize) -> Operator {
        Operator(vec![vec![Complex64::new(0.0, 0.0); size]; size])
    }

    fn add(&mut self, weight: f64, state: &Vector) {
        for (row, a) in self.0.iter_mut().zip(state) {
            for (entry, b) in row.iter_mut().zip(state) {
                *entry += weight * a * b.conj();
            }
        }
    }

    fn distance(&self, other: &Operator) -> f64 {
        let rows = self.0.iter().zip(&other.0);
        rows.flat_map(|(a, b)| a.iter().zip(b).map(|(x, y)| (x - y).norm()))
            .fold(0.0, f64::max)
    }

    fn trace(&self) -> f64 {
        (0..self.0.len()).map(|i| self.0[i][i].re).sum()
    }

    /// (1 − 1/k)·self + (ξ/k)·σ.
    fn mixed(&self, terms: usize, extent: f64, companion: &Operator) -> Operator {
        let k = terms as f64;
        let mut mixed = self.clone();
        for (row, other) in mixed.0.iter_mut().zip(&companion.0) {
            for (entry, b) in row.iter_mut().zip(other) {
                *entry = *entry * (1.0 - 1.0 / k) + b * (extent / k);
            }
        }
        mixed
    }
}

/// Words given in advance, to walk through all outcomes of a draw.
struct Script(VecDeque<u64>);

impl TryRng for Script {
    type Error = Infallible;

    fn try_next_u32(&mut self) -> Result<u32, Infallible> {
        unreachable!("draws take whole words")
    }

    fn try_next_u64(&mut self) -> Result<u64, Infallible> {
        Ok(self.0.pop_front().expect("a word for every choice"))
    }

    fn try_fill_bytes(&mut self, _: &mut [u8]) -> Result<(), Infallible> {
        unreachable!("draws take whole words")
    }
}

/// A draw of a site with two components, given which terms have the last one.
fn two_component_draw(sparsifier: &Sparsifier, lasts: impl IntoIterator<Item = bool>) -> Draw {
    let lasts: Vec<bool> = lasts.into_iter().collect();
    let mut rng = Pcg64::seed_from_u64(9);
    let mut draw = Draw::new();
    sparsifier.draw_members(&mut rng, &mut draw);
    sparsifier.draw_terms(lasts.len(), &mut rng, &mut draw);
    let plane = draw.components.plane_mut(0);
    plane.fill(0);
    for (term, last) in lasts.into_iter().enumerate() {
        plane[term / 64] |= u64::from(last) << (term % 64);
    }
    draw
}

/// Chances of diag(1, i) for a rotation: |c_S| ∝ sin(θ/2), |c_I| ∝ sin(π/4−θ/2);
/// Quantum 3, 181 (2019), from memory.
fn chance_of_s(angle: f64) -> f64 {
    let (identity, s) = ((FRAC_PI_4 - 0.5 * angle).sin(), (0.5 * angle).sin());
    s / (identity + s)
}

fn rotated_plus(angle: f64) -> Vector {
    vec![
        Complex64::new(FRAC_1_SQRT_2, 0.0),
        Complex64::from_polar(FRAC_1_SQRT_2, angle),
    ]
}

#[test]
fn all_draws_of_one_rotation_give_the_law() {
    for angle in [FRAC_PI_4, 0.3, 1.1] {
        let sites = [rotation(angle, 0.0)];
        let sparsifier = Sparsifier::new(&sites);
        let chance = chance_of_s(angle);
        for terms in 1..=6 {
            let mut mean = Operator::zero(2);
            for pattern in 0u32..1 << terms {
                let draw =
                    two_component_draw(&sparsifier, (0..terms).map(|j| pattern >> j & 1 == 1));
                let ones = pattern.count_ones() as i32;
                let probability = chance.powi(ones) * (1.0 - chance).powi(terms as i32 - ones);
                mean.add(probability, &sum_of_terms(&sites, &draw));
            }
            let mut ideal = Operator::zero(2);
            ideal.add(1.0, &rotated_plus(angle));
            let mut companion = Operator::zero(2);
            companion.add(1.0 - chance, &rotated_plus(0.0));
            companion.add(chance, &rotated_plus(2.0 * FRAC_PI_4));
            let extent = sites[0].extent;
            let expected = ideal.mixed(terms, extent, &companion);
            assert!(mean.distance(&expected) < 1e-14, "{angle}, k = {terms}");
            let norm = mixing::mean_norm(sparsifier.log_extent(), terms as u64);
            assert!((mean.trace() - norm).abs() < 1e-14);
        }
    }
}

/// P_out(0) of h, rotation, h, summed over all draws (only the number of S
/// matters) against the published values of the law; derived and recomputed.
#[test]
fn all_draws_give_the_outcomes_of_one_rotation() {
    for (angle, terms, expected) in [
        (FRAC_PI_4, 1, 0.75),
        (FRAC_PI_4, 2, 0.797685892458),
        (FRAC_PI_4, 5, 0.830094310254),
        (FRAC_PI_4, 10, 0.841625997942),
        (FRAC_PI_4, 100, 0.852342265120),
        (0.3, 1, 0.899427338071),
        (0.3, 10, 0.969119989796),
        (1.1, 1, 0.654269621158),
        (1.1, 10, 0.718626063367),
    ] {
        let sites = [rotation(angle, 0.0)];
        let sparsifier = Sparsifier::new(&sites);
        let chance = chance_of_s(angle);
        let (mut zero, mut both) = (0.0, 0.0);
        let mut probability = (1.0 - chance).powi(terms);
        for ones in 0..=terms {
            let draw = two_component_draw(&sparsifier, (0..terms).map(|j| j < ones));
            let state = sum_of_terms(&sites, &draw);
            zero += probability * 0.5 * (state[0] + state[1]).norm_sqr();
            both += probability * (state[0].norm_sqr() + state[1].norm_sqr());
            probability *= f64::from(terms - ones) / f64::from(ones + 1) * chance / (1.0 - chance);
        }
        let found: f64 = zero / both;
        assert!(
            (found / expected - 1.0).abs() < 1e-9,
            "{angle}, k = {terms}: {found}"
        );
    }
}

/// h h h, ccz, h h h: P(000) = 9/16 and 1/16 for the other seven; the companion
/// has 0.34375 and 0.09375. Derived from the eight diagonal forms.
#[test]
fn all_draws_give_the_outcomes_of_a_ccz() {
    let sites = [ccz()];
    let sparsifier = Sparsifier::new(&sites);
    for terms in 1..=3u32 {
        let mut outcomes = [0.0; 8];
        let draws = 8u64.pow(terms);
        for string in 0..draws {
            let plane = |bit: u32| (0..terms).map(move |j| (string >> (3 * j + bit) & 1) << j);
            let words = (0..3).map(|bit| plane(bit).sum::<u64>());
            let mut script = Script(words.collect());
            let mut draw = Draw::new();
            sparsifier.draw_members(&mut script, &mut draw);
            sparsifier.draw_terms(terms as usize, &mut script, &mut draw);
            let state = sum_of_terms(&sites, &draw);
            for (y, total) in outcomes.iter_mut().enumerate() {
                // ⟨y|H⊗H⊗H.
                let amplitude: Complex64 = state
                    .iter()
                    .enumerate()
                    .map(|(x, a)| {
                        if (x & y).count_ones() % 2 == 1 {
                            -a
                        } else {
                            *a
                        }
                    })
                    .sum();
                *total += amplitude.norm_sqr() / 8.0 / draws as f64;
            }
        }
        let norm: f64 = outcomes.iter().sum();
        let (k, extent) = (f64::from(terms), 16.0 / 9.0);
        assert!((norm - (k - 1.0 + extent) / k).abs() < 1e-14);
        for (y, outcome) in outcomes.into_iter().enumerate() {
            let (ideal, companion) = if y == 0 {
                (9.0 / 16.0, 0.34375)
            } else {
                (1.0 / 16.0, 0.09375)
            };
            let expected = ((k - 1.0) * ideal + extent * companion) / (k - 1.0 + extent);
            assert!(
                (outcome / norm - expected).abs() < 1e-14,
                "k = {terms}, y = {y}"
            );
        }
    }
}

/// One-qubit sites of every kind: dephased, prepared in a mixed state, pure.
fn every_kind() -> Vec<Site> {
    vec![
        rotation(FRAC_PI_4, 0.05),
        prepared([-0.45, 0.6, 0.55]),
        rotation(0.3, 0.0),
    ]
}

/// The exact ideal and companion states of [`every_kind`], from what the sites
/// were made of and, for the companion, from the members' weights.
fn exact(sites: &[Site]) -> (Operator, Operator) {
    // Density matrices of the single sites, from their Bloch vectors.
    let bloch = |angle: f64, length: f64| [length * angle.cos(), length * angle.sin(), 0.0];
    let ideal = [bloch(FRAC_PI_4, 0.9), [-0.45, 0.6, 0.55], bloch(0.3, 1.0)];
    let companion: Vec<[f64; 3]> = sites
        .iter()
        .map(|site| {
            let mut mean = [0.0; 3];
            let mut add = |share: f64, state: &Vector| {
                let vector = super::super::bloch::of_amplitudes([state[0], state[1]]);
                mean.iter_mut()
                    .zip(vector)
                    .for_each(|(m, x)| *m += share * x);
            };
            match &site.kind {
                SiteKind::Rotation(rotation) => {
                    for member in &rotation.members {
                        let chance = chance_of_s(member.angle);
                        add(
                            member.probability * (1.0 - chance),
                            &component_state(site, 0, 0),
                        );
                        add(member.probability * chance, &component_state(site, 0, 1));
                    }
                }
                SiteKind::Prepared(state) => {
                    for (index, member) in (0..).zip(&state.members) {
                        let sum: f64 = member.components.iter().map(|(_, w)| w.norm()).sum();
                        for (c, (_, weight)) in (0..).zip(&member.components) {
                            let share = member.probability * weight.norm() / sum;
                            add(share, &component_state(site, index, c));
                        }
                    }
                }
                SiteKind::Ccz(_) => unreachable!("one-qubit sites only"),
            }
            mean
        })
        .collect();
    (product(&ideal), product(&companion))
}

/// Product of the one-qubit states with these Bloch vectors, the first one the
/// lowest bit.
fn product(vectors: &[[f64; 3]]) -> Operator {
    let size = 1 << vectors.len();
    let mut operator = Operator::zero(size);
    for (i, row) in operator.0.iter_mut().enumerate() {
        for (j, entry) in row.iter_mut().enumerate() {
            *entry = Complex64::new(1.0, 0.0);
            for (q, &[x, y, z]) in vectors.iter().enumerate() {
                *entry *= 0.5
                    * match (i >> q & 1, j >> q & 1) {
                        (0, 0) => Complex64::new(1.0 + z, 0.0),
                        (1, 1) => Complex64::new(1.0 - z, 0.0),
                        (0, _) => Complex64::new(x, -y),
                        _ => Complex64::new(x, y),
                    };
            }
        }
    }
    operator
}

/// Every entry of E[ΩΩ†] by sampling, 64 real numbers and the norm: 65 two-sided
/// tests at 1e-6/65 each, 5.657 standard errors (normal quantile, scipy), so that
/// a right program fails for one seed in a million.
#[test]
fn sampled_terms_of_every_kind_follow_the_law() {
    let sites = every_kind();
    let sparsifier = Sparsifier::new(&sites);
    let extent = sparsifier.log_extent().exp();
    let (ideal, companion) = exact(&sites);
    let (terms, draws) = (4, 40_000);
    let expected = ideal.mixed(terms, extent, &companion);

    let mut rng = Pcg64::seed_from_u64(3);
    let mut draw = Draw::new();
    let mut sums = [[0.0f64; 2]; 65];
    for _ in 0..draws {
        sparsifier.draw_members(&mut rng, &mut draw);
        sparsifier.draw_terms(terms, &mut rng, &mut draw);
        let state = sum_of_terms(&sites, &draw);
        let mut record = |slot: usize, value: f64| {
            sums[slot][0] += value;
            sums[slot][1] += value * value;
        };
        for i in 0..8 {
            for j in 0..8 {
                let entry = state[i] * state[j].conj();
                // Real parts on and above the diagonal, imaginary parts below.
                record(8 * i + j, if i <= j { entry.re } else { entry.im });
            }
        }
        record(64, state.iter().map(|a| a.norm_sqr()).sum());
    }
    for (slot, [sum, squares]) in sums.into_iter().enumerate() {
        let (i, j) = (slot / 8, slot % 8);
        let target = match slot {
            64 => mixing::mean_norm(sparsifier.log_extent(), terms as u64),
            _ if i <= j => expected.0[i][j].re,
            _ => expected.0[i][j].im,
        };
        let n = f64::from(draws);
        let mean = sum / n;
        let standard_error = ((squares / n - mean * mean) / n).sqrt();
        let deviation = (mean - target) / standard_error.max(1e-12);
        assert!(
            deviation.abs() < 5.657,
            "entry {i}, {j}: {mean}, expected {target}"
        );
    }
}

/// The companion is σ: the mean of one unit-weight term, 64 tests as above.
#[test]
fn companions_are_one_unit_term() {
    let sites = every_kind();
    let sparsifier = Sparsifier::new(&sites);
    let (_, expected) = exact(&sites);
    let draws = 40_000;
    let mut rng = Pcg64::seed_from_u64(4);
    let mut draw = Draw::new();
    let mut sums = [[0.0f64; 2]; 64];
    for _ in 0..draws {
        sparsifier.draw_companion(&mut rng, &mut draw);
        assert_eq!(draw.terms, 1);
        assert_eq!(draw.log_extent, 0.0);
        assert!((draw.weight(&sites, 0).norm() - 1.0).abs() < 1e-14);
        let state = sum_of_terms(&sites, &draw);
        for (slot, [sum, squares]) in sums.iter_mut().enumerate() {
            let (i, j) = (slot / 8, slot % 8);
            let entry = state[i] * state[j].conj();
            let value = if i <= j { entry.re } else { entry.im };
            *sum += value;
            *squares += value * value;
        }
    }
    for (slot, [sum, squares]) in sums.into_iter().enumerate() {
        let (i, j) = (slot / 8, slot % 8);
        let entry = expected.0[i][j];
        let target = if i <= j { entry.re } else { entry.im };
        let n = f64::from(draws);
        let mean = sum / n;
        let standard_error = ((squares / n - mean * mean) / n).sqrt();
        let deviation = (mean - target) / standard_error.max(1e-12);
        assert!(
            deviation.abs() < 5.657,
            "entry {i}, {j}: {mean}, expected {target}"
        );
    }
}

/// Components of neighbouring terms of a CCZ come from the same words: all 64
/// pairs are equally likely. χ² with 63 degrees of freedom, upper point 131.37
/// at 1e-6 (scipy).
#[test]
fn ccz_components_are_uniform_and_independent() {
    let sites = [ccz()];
    let sparsifier = Sparsifier::new(&sites);
    let mut rng = Pcg64::seed_from_u64(5);
    let mut draw = Draw::new();
    let mut counts = [0u32; 64];
    let (terms, draws) = (100, 2_000);
    for _ in 0..draws {
        sparsifier.draw_members(&mut rng, &mut draw);
        sparsifier.draw_terms(terms, &mut rng, &mut draw);
        for term in (0..terms).step_by(2) {
            let (a, b) = (draw.component(0, term), draw.component(0, term + 1));
            counts[usize::from(8 * a + b)] += 1;
        }
    }
    let expected = f64::from(terms as u32 / 2 * draws) / 64.0;
    let chi_squared: f64 = counts
        .iter()
        .map(|&count| (f64::from(count) - expected).powi(2) / expected)
        .sum();
    assert!(chi_squared < 131.37, "{chi_squared}");
}

#[test]
fn drawing_again_reuses_the_buffers() {
    let sites = [every_kind(), vec![ccz()]].concat();
    let sparsifier = Sparsifier::new(&sites);
    let mut rng = Pcg64::seed_from_u64(6);
    let mut draw = Draw::new();
    sparsifier.draw_members(&mut rng, &mut draw);
    sparsifier.draw_terms(1000, &mut rng, &mut draw);
    let buffers = |draw: &Draw| (draw.members.as_ptr(), draw.components.bits().as_ptr());
    let first = buffers(&draw);
    for terms in [1000, 10, 1, 999] {
        sparsifier.draw_members(&mut rng, &mut draw);
        sparsifier.draw_terms(terms, &mut rng, &mut draw);
        assert_eq!(buffers(&draw), first);
        // One bit, two, one and three.
        assert_eq!(draw.components.bits().len(), 7 * terms.div_ceil(64));
    }
}

/// A stabiliser mixture needs no luck: one term is the member itself.
#[test]
fn sites_without_magic_draw_exact_members() {
    let sites = [rotation(FRAC_PI_4, 0.3), prepared([0.2, -0.3, 0.1])];
    let sparsifier = Sparsifier::new(&sites);
    assert_eq!(sparsifier.log_extent(), 0.0);
    let mut rng = Pcg64::seed_from_u64(7);
    let mut draw = Draw::new();
    for _ in 0..100 {
        sparsifier.draw_members(&mut rng, &mut draw);
        sparsifier.draw_terms(1, &mut rng, &mut draw);
        assert!((draw.weight(&sites, 0).norm() - 1.0).abs() < 1e-14);
        let SiteKind::Rotation(site) = &sites[0].kind else {
            unreachable!()
        };
        let angle = site.members[usize::from(draw.members[0])].angle;
        assert_eq!(f64::from(draw.component(0, 0)) * 2.0 * FRAC_PI_4, angle);
    }
}

#[test]
fn huge_extents_give_finite_weights() {
    let sites = vec![ccz(); 10_000];
    let sparsifier = Sparsifier::new(&sites);
    assert!(sparsifier.log_extent() > 5_000.0);
    let mut rng = Pcg64::seed_from_u64(8);
    let mut draw = Draw::new();
    sparsifier.draw_members(&mut rng, &mut draw);
    sparsifier.draw_terms(3, &mut rng, &mut draw);
    assert!(draw.modulus.is_finite());
    sparsifier.draw_companion(&mut rng, &mut draw);
    assert_eq!(draw.modulus, 1.0);
}

/// Every bit of a plane is 1 with chance 1 − threshold/2^64, whatever its place;
/// thresholds with few and with many digits. 64 + 1 tests a threshold at 1e-6
/// each: 4.9 standard deviations, from the normal law (scipy).
#[test]
fn planes_have_their_chance_in_every_place() {
    let mut rng = Pcg64::seed_from_u64(10);
    let words = 20_000;
    let mut plane = vec![0; words];
    for chance in [0.5, 0.25, 0.3, 0.01, 0.99, 1.0 / 3.0] {
        let threshold = ((1.0 - chance) * 2f64.powi(64)) as u64;
        draw_plane(threshold, &mut rng, &mut plane);
        let deviation =
            |ones: f64, n: f64| (ones - n * chance) / (n * chance * (1.0 - chance)).sqrt();
        let mut total = 0.0;
        for place in 0..64 {
            let ones: u64 = plane.iter().map(|word| word >> place & 1).sum();
            total += ones as f64;
            assert!(
                deviation(ones as f64, words as f64).abs() < 4.9,
                "{chance}, bit {place}"
            );
        }
        assert!(
            deviation(total, 64.0 * words as f64).abs() < 4.9,
            "{chance}"
        );
        // Neighbours are independent.
        let pairs: u32 = plane
            .iter()
            .map(|word| (word & word.rotate_left(1)).count_ones())
            .sum();
        let (n, both) = (64.0 * words as f64, chance * chance);
        let spread = (n * both * (1.0 - both) + 2.0 * n * (chance * both - both * both)).sqrt();
        assert!(
            (f64::from(pairs) - n * both).abs() < 4.9 * spread,
            "{chance}"
        );
    }
}
