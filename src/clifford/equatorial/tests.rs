//! Overlaps against dense sums, averages over all forms, and full width.

use num_complex::Complex64;
use rand::{RngExt, SeedableRng};
use rand_pcg::Pcg64Mcg;

use super::*;
use crate::clifford::kernels::Level;
use crate::clifford::terms::tests::{Dense, Pair, quarter};

/// ⟨θ|Π_m v⟩ by the definition of |θ⟩.
fn dense_overlap<const W: usize>(
    form: &EquatorialForm<W>,
    pair: &Pair<W>,
    qubit: usize,
) -> [Complex64; 2] {
    let mut sums = [Complex64::ZERO; 2];
    let size: u32 = form.active().iter().map(|word| word.count_ones()).sum();
    for Dense(amplitudes) in &pair.vectors {
        for (y, a) in amplitudes.iter().enumerate() {
            let power = form.value(&pair.layout.mask(y));
            sums[y >> qubit & 1] += quarter(usize::from(power)).conj() * a;
        }
    }
    sums.map(|sum| sum * 0.5f64.powf(f64::from(size) / 2.0))
}

fn check<const W: usize>(r: usize, capacity: usize, count: usize, seed: u64) {
    let mut rng = Pcg64Mcg::seed_from_u64(seed);
    let mut pair = Pair::<W>::new(r, capacity, count, &mut rng);
    let mut form = EquatorialForm::new(capacity);
    for _ in 0..60 {
        pair.step(&mut rng);
        // Active slots that happen to be idle do no harm.
        let mut active = pair.layout.mask((1 << r) - 1);
        active[0] |= 1 << rng.random_range(0..capacity.min(64));
        form.randomise(&active, &mut rng);
        for (qubit, &slot) in pair.layout.0.iter().enumerate() {
            let expected = dense_overlap(&form, &pair, qubit);
            let found = pair.terms.overlaps(&form, slot);
            for m in 0..2 {
                assert!(
                    (found[m] - expected[m]).norm() < 1e-12,
                    "{found:?} instead of {expected:?}"
                );
            }
        }
    }
}

#[test]
fn overlaps_are_dense_sums() {
    for seed in 0..4 {
        for r in 1..=6 {
            check::<1>(r, r, 1, seed);
            check::<1>(r, 64, 4, 50 + seed);
            check::<2>(r, 99, 3, seed);
            check::<4>(r, 250, 3, seed);
        }
    }
    check::<1>(8, 20, 2, 1);
    check::<4>(8, 256, 2, 1);
}

#[test]
fn without_active_slots_the_overlap_is_the_weight() {
    let mut terms = Terms::<1>::new(3);
    let weights = [Complex64::new(0.5, 1.0), Complex64::new(0.25, -3.0)];
    terms.reset(&weights);
    let form = EquatorialForm::new(3);
    let [zero, one] = terms.overlaps(&form, 1);
    assert_eq!(zero, weights[0] + weights[1]);
    assert_eq!(one, Complex64::ZERO);
    assert_eq!(EquatorialForm::<1>::new(0).value(&[0]), 0);
}

/// A(x) is the quadratic form its values on one and two bits say, and every
/// coefficient is drawn uniformly: 4,000 forms, each count within five
/// standard deviations (false alarm below 1e-4 over all 150 counts).
#[test]
fn random_forms_are_uniform_quadratic_forms() {
    let mut rng = Pcg64Mcg::seed_from_u64(7);
    let slots = [1usize, 63, 64, 70, 127];
    let mask = |bits: usize| {
        let mut mask = [0u64; 2];
        for (i, slot) in slots.iter().enumerate() {
            mask[slot / 64] |= ((bits >> i & 1) as u64) << (slot % 64);
        }
        mask
    };
    let mut form = EquatorialForm::<2>::new(128);
    let mut diagonal = [[0u32; 4]; 5];
    let mut pairs = [[0u32; 5]; 5];
    const FORMS: u32 = 4000;
    for _ in 0..FORMS {
        form.randomise(&mask(31), &mut rng);
        let a: Vec<u8> = (0..5).map(|i| form.value(&mask(1 << i))).collect();
        let pair = |i: usize, j: usize| (form.value(&mask(1 << i | 1 << j)) + 8 - a[i] - a[j]) % 4;
        for i in 0..5 {
            diagonal[i][usize::from(a[i])] += 1;
            for (j, count) in pairs[i].iter_mut().enumerate().take(i) {
                assert_eq!(pair(i, j) % 2, 0);
                *count += u32::from(pair(i, j) / 2);
            }
        }
        for x in 0..32 {
            let mut value = 0;
            for i in (0..5).filter(|i| x >> i & 1 == 1) {
                value += a[i];
                value += (0..i)
                    .filter(|j| x >> j & 1 == 1)
                    .map(|j| pair(i, j))
                    .sum::<u8>();
            }
            assert_eq!(form.value(&mask(x)), value % 4);
        }
    }
    let near = |count: u32, p: f64| {
        let mean = f64::from(FORMS) * p;
        (f64::from(count) - mean).abs() < 5.0 * (mean * (1.0 - p)).sqrt()
    };
    for i in 0..5 {
        assert!(
            diagonal[i].iter().all(|&count| near(count, 0.25)),
            "{diagonal:?}"
        );
        assert!((0..i).all(|j| near(pairs[i][j], 0.5)), "{pairs:?}");
    }
}

/// All forms on r slots 0, 1, …, from the digits of a number.
fn all_forms(r: usize) -> impl Iterator<Item = EquatorialForm<1>> {
    let bits = 2 * r + r * (r - 1) / 2;
    (0..1u64 << bits).map(move |number| {
        let mut form = EquatorialForm::new(r);
        let mut left = number;
        form.fill(&[(1 << r) - 1], |used| {
            let word = left & used.0[0];
            left >>= used.weight();
            Bits([word])
        });
        form
    })
}

/// Averaged over all forms, 2^r|⟨θ|Π_mΩ⟩|² is ‖Π_mΩ‖², and for a single term
/// its square is at most twice that squared (Quantum 3, 181 (2019), from
/// memory): the relative variance is at most 1.
#[test]
fn the_mean_over_all_forms_is_the_norm() {
    for (r, seeds) in [(1, 20), (2, 20), (3, 10), (4, 2)] {
        for seed in 0..seeds {
            let count = 1 + seed as usize % 3;
            let mut rng = Pcg64Mcg::seed_from_u64(seed);
            let mut pair = Pair::<1>::new(r, r, count, &mut rng);
            for _ in 0..12 {
                pair.step(&mut rng);
            }
            let qubit = rng.random_range(0..r);
            let slot = pair.layout.0[qubit];
            let (mut first, mut second, mut number) = ([0.0; 2], [0.0; 2], 0.0);
            for form in all_forms(r) {
                let overlaps = pair.terms.overlaps(&form, slot);
                for m in 0..2 {
                    let estimate = f64::from(1 << r) * overlaps[m].norm_sqr();
                    first[m] += estimate;
                    second[m] += estimate * estimate;
                }
                number += 1.0;
            }
            for m in 0..2 {
                let mut sum = Dense::new(r, Complex64::ZERO);
                for vector in &pair.vectors {
                    for (a, b) in sum.0.iter_mut().zip(&vector.0) {
                        *a += b;
                    }
                }
                sum.project(qubit, m == 1);
                let norm = sum.norm_squared();
                assert!((first[m] / number - norm).abs() < 1e-12 * norm.max(1.0));
                if count == 1 {
                    assert!(second[m] / number < 2.0 * norm * norm + 1e-12);
                }
            }
        }
    }
}

/// At full width, where no dense vector exists: |θ⟩ prepared as a term has
/// ⟨θ|θ⟩ = 1, half of it from either value of every slot; and with a sign on
/// one slot the halves cancel.
#[test]
fn an_equatorial_state_overlaps_itself() {
    fn run<const W: usize>(seed: u64) {
        let mut rng = Pcg64Mcg::seed_from_u64(seed);
        let slots = 64 * W;
        let mut form = EquatorialForm::<W>::new(slots);
        form.randomise(&[!0; W], &mut rng);
        let mut terms = Terms::<W>::new(slots);
        terms.reset(&[Complex64::ONE]);
        let single = |slot: usize| form.value(&Bits::one(slot).0);
        for slot in 0..slots {
            terms.plus(slot);
            terms.diagonal(slot, |_| single(slot));
            for other in 0..slot {
                let both = form.value(&(Bits::one(slot) | Bits::one(other)).0);
                if (both + 8 - single(slot) - single(other)) % 4 == 2 {
                    let third = usize::from(slot == 0 || other == 0);
                    terms.quadratic([slot, other, third], |_| {
                        crate::clifford::terms::QuadraticPhase {
                            cz: [true, false, false],
                            ..Default::default()
                        }
                    });
                }
            }
        }
        for slot in 0..slots {
            let halves = terms.overlaps(&form, slot);
            for half in halves {
                assert!((half - 0.5).norm() < 1e-12, "{half}");
            }
        }
        let slot = rng.random_range(0..slots);
        terms.diagonal(slot, |_| 2);
        for other in 0..slots {
            let halves = terms.overlaps(&form, other);
            let expected = if other == slot { 0.5 } else { 0.0 };
            assert!((halves[0] - expected).norm() < 1e-12);
            assert!((halves[1] + expected).norm() < 1e-12);
        }
    }
    run::<1>(1);
    run::<2>(2);
    run::<4>(3);
}

/// The same sums, bit for bit, whatever the instructions.
#[test]
fn levels_agree_bit_for_bit() {
    let mut rng = Pcg64Mcg::seed_from_u64(11);
    for _ in 0..40 {
        let mut pair = Pair::<1>::new(6, 9, 20, &mut rng);
        for _ in 0..30 {
            pair.step(&mut rng);
        }
        let mut form = EquatorialForm::<1>::new(9);
        form.randomise(&[0x1ff], &mut rng);
        let sums = |level| {
            let mut terms = pair.terms.clone();
            terms.set_level(level);
            terms
                .overlaps(&form, 3)
                .map(|sum| (sum.re.to_bits(), sum.im.to_bits()))
        };
        let plain = sums(Level::PLAIN);
        assert!(Level::all().into_iter().all(|level| sums(level) == plain));
    }
}
