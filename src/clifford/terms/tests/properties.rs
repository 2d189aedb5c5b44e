//! Laws that hold at any width, where no dense vector exists.

use num_complex::Complex64;
use proptest::prelude::*;
use rand::{Rng, RngExt, SeedableRng};
use rand_pcg::Pcg64Mcg;

use crate::clifford::terms::{Mask, Terms};

#[derive(Debug, Clone, Copy)]
struct Pauli<const W: usize> {
    phase: u8,
    x: Mask<W>,
    z: Mask<W>,
}

impl<const W: usize> Pauli<W> {
    fn random<R: Rng>(slots: usize, hermitian: bool, rng: &mut R) -> Self {
        // Dense and sparse ones.
        let sparse = rng.random_bool(0.3);
        let mut mask = || -> Mask<W> {
            std::array::from_fn(|word| {
                let used = match slots.saturating_sub(64 * word) {
                    left @ 0..64 => (1u64 << left) - 1,
                    _ => !0,
                };
                let draw = rng.random::<u64>() & used;
                if sparse {
                    draw & rng.random::<u64>() & rng.random::<u64>() & rng.random::<u64>()
                } else {
                    draw
                }
            })
        };
        let (x, z) = (mask(), mask());
        let odd = (0..W).map(|w| (x[w] & z[w]).count_ones()).sum::<u32>() % 2 == 1;
        let phase = u8::from(odd == hermitian) + 2 * u8::from(rng.random::<bool>());
        Self { phase, x, z }
    }

    fn apply(&self, terms: &mut Terms<W>) {
        terms.primitive(self.phase, &self.x, &self.z);
    }

    fn inverse(&self) -> Self {
        Self {
            phase: self.phase ^ 2,
            ..*self
        }
    }

    fn commutes(&self, other: &Self) -> bool {
        let words = 0..W;
        words
            .map(|w| (self.x[w] & other.z[w]).count_ones() + (self.z[w] & other.x[w]).count_ones())
            .sum::<u32>()
            % 2
            == 0
    }
}

/// A state reached by random Clifford gates on all slots.
fn scramble<const W: usize, R: Rng>(slots: usize, rng: &mut R) -> Terms<W> {
    let mut terms = Terms::new(slots);
    terms.reset(&[Complex64::new(0.6, -0.8); 2]);
    for slot in 0..slots {
        if rng.random() {
            terms.plus(slot);
        }
    }
    for _ in 0..rng.random_range(0..2 * slots) {
        Pauli::random(slots, false, rng).apply(&mut terms);
        let powers = [rng.random(), rng.random()];
        terms.diagonal(rng.random_range(0..slots), |label| powers[label as usize]);
        let (control, target) = (rng.random_range(0..slots), rng.random_range(0..slots));
        if control != target {
            terms.controlled_not(control, target);
        }
    }
    terms
}

/// A basis state with an amplitude: measure every slot.
fn support<const W: usize>(terms: &Terms<W>, index: usize) -> Mask<W> {
    let label = terms.label(index);
    let mut copy = terms.clone();
    let mut x = [0; W];
    for slot in 0..terms.slots() {
        let at = (0..copy.len()).find(|&i| copy.label(i) == label).unwrap();
        let value = copy.certain(at, slot).unwrap_or(slot % 2 == 0);
        copy.measured(slot, value);
        x[slot / 64] |= u64::from(value) << (slot % 64);
    }
    x
}

/// Same terms, same amplitudes at points of the support of either.
fn assert_same<const W: usize>(a: &Terms<W>, b: &Terms<W>) {
    assert_eq!(a.len(), b.len());
    for index in 0..a.len() {
        assert_eq!(a.label(index), b.label(index));
        let size = a.norm_squared(index);
        assert!((size - b.norm_squared(index)).abs() < 1e-10 * size);
        for x in [support(a, index), support(b, index)] {
            let (left, right) = (a.amplitude(index, &x), b.amplitude(index, &x));
            assert!(left.norm() > 0.0);
            assert!((left - right).norm() < 1e-10 * left.norm());
        }
    }
}

fn laws<const W: usize>(slots: usize, seed: u64) {
    let mut rng = Pcg64Mcg::seed_from_u64(seed);
    let terms = scramble::<W, _>(slots, &mut rng);
    assert!((terms.norm_squared(0) - 1.0).abs() < 1e-10);

    // (1 + Q)/√2 and (1 − Q)/√2 with Q² = −1 undo each other.
    let unitary = Pauli::random(slots, false, &mut rng);
    let mut other = terms.clone();
    unitary.apply(&mut other);
    unitary.inverse().apply(&mut other);
    assert_same(&terms, &other);

    // (1 + Q)/√2 with Q² = 1 twice is √2 times once.
    let hermitian = Pauli::random(slots, true, &mut rng);
    let mut once = terms.clone();
    hermitian.apply(&mut once);
    let mut twice = once.clone();
    hermitian.apply(&mut twice);
    once.scale(|_| Complex64::new(2f64.sqrt(), 0.0));
    assert_same(&once, &twice);

    // Commuting ones commute.
    let second = Pauli::random(slots, rng.random(), &mut rng);
    let first = if unitary.commutes(&second) {
        unitary
    } else {
        hermitian
    };
    if first.commutes(&second) {
        let (mut left, mut right) = (terms.clone(), terms.clone());
        first.apply(&mut left);
        second.apply(&mut left);
        second.apply(&mut right);
        first.apply(&mut right);
        assert_same(&left, &right);
    }

    // Gates of order two.
    let (control, target) = (rng.random_range(0..slots), rng.random_range(0..slots));
    let mut other = terms.clone();
    if control != target {
        other.controlled_not(control, target);
        other.controlled_not(control, target);
    }
    other.flip(target);
    other.flip(target);
    assert_same(&terms, &other);

    // The two outcomes of a measurement share the norm.
    let slot = rng.random_range(0..slots);
    let mut sum = 0.0;
    for value in [false, true] {
        let mut branch = terms.clone();
        branch.measured(slot, value);
        sum += (0..branch.len())
            .map(|i| branch.norm_squared(i))
            .sum::<f64>();
        assert!((0..branch.len()).all(|i| branch.certain(i, slot) == Some(false)));
    }
    assert!((sum - 2.0).abs() < 1e-10);
}

proptest! {
    #![proptest_config(ProptestConfig::with_cases(48))]

    #[test]
    fn laws_hold_in_one_word(slots in 1usize..=64, seed: u64) {
        laws::<1>(slots, seed);
    }

    #[test]
    fn laws_hold_in_two_words(slots in 1usize..=128, seed: u64) {
        laws::<2>(slots, seed);
    }

    #[test]
    fn laws_hold_in_four_words(slots in 1usize..=256, seed: u64) {
        laws::<4>(slots, seed);
    }

    /// A long random product of Clifford gates, undone, gives |0…0⟩ with its
    /// phase, on all slots of every width.
    #[test]
    fn what_is_done_can_be_undone(seed: u64) {
        fn run<const W: usize>(seed: u64) {
            let mut rng = Pcg64Mcg::seed_from_u64(seed);
            let slots = 64 * W;
            let mut terms = Terms::<W>::new(slots);
            terms.reset(&[Complex64::new(0.6, 0.8)]);
            let paulis: Vec<_> = (0..3 * slots)
                .map(|_| Pauli::random(slots, false, &mut rng))
                .collect();
            for pauli in &paulis {
                pauli.apply(&mut terms);
            }
            for pauli in paulis.iter().rev() {
                pauli.inverse().apply(&mut terms);
            }
            assert!((0..slots).all(|slot| terms.certain(0, slot) == Some(false)));
            let amplitude = terms.amplitude(0, &[0; W]);
            assert!((amplitude - Complex64::new(0.6, 0.8)).norm() < 1e-12);
        }
        run::<1>(seed);
        run::<2>(seed);
        run::<4>(seed);
    }
}
