//! Random sequences of every operation.

use num_complex::Complex64;
use rand::{Rng, RngExt, SeedableRng};
use rand_pcg::Pcg64Mcg;

use super::dense::{Dense, Layout, compare};
use crate::clifford::terms::{QuadraticPhase, Terms};
use crate::magic::Stabiliser;

const STATES: [Stabiliser; 6] = [
    Stabiliser::Zero,
    Stabiliser::One,
    Stabiliser::Plus,
    Stabiliser::Minus,
    Stabiliser::PlusI,
    Stabiliser::MinusI,
];

fn random_phase<R: Rng>(rng: &mut R) -> QuadraticPhase {
    QuadraticPhase {
        z: rng.random(),
        cz: rng.random(),
        negative: rng.random(),
    }
}

/// Terms and their dense twins.
pub(crate) struct Pair<const W: usize> {
    pub(crate) terms: Terms<W>,
    pub(crate) vectors: Vec<Dense>,
    pub(crate) layout: Layout,
    idle: Vec<bool>,
}

impl<const W: usize> Pair<W> {
    pub(crate) fn new<R: Rng>(r: usize, capacity: usize, count: usize, rng: &mut R) -> Self {
        let mut pair = Self {
            terms: Terms::new(capacity),
            vectors: Vec::new(),
            layout: Layout::random(r, capacity, rng),
            idle: Vec::new(),
        };
        pair.reset(count, rng);
        pair
    }

    fn reset<R: Rng>(&mut self, count: usize, rng: &mut R) {
        let r = self.layout.0.len();
        let weights: Vec<Complex64> = (0..count)
            .map(|_| Complex64::from_polar(rng.random_range(0.5..1.0), rng.random_range(0.0..6.3)))
            .collect();
        self.terms.reset(&weights);
        self.vectors = weights.iter().map(|&w| Dense::new(r, w)).collect();
        self.idle = vec![true; r];
    }

    /// A random operation with random parameters, on both.
    pub(crate) fn step<R: Rng>(&mut self, rng: &mut R) {
        let r = self.layout.0.len();
        let qubit = rng.random_range(0..r);
        let slot = self.layout.0[qubit];
        if self.idle[qubit] && rng.random_bool(0.5) {
            self.idle[qubit] = false;
            if rng.random_bool(0.3) {
                self.terms.plus(slot);
                for v in &mut self.vectors {
                    v.prepare(qubit, Stabiliser::Plus);
                }
            } else {
                let states: Vec<_> = (0..self.vectors.len())
                    .map(|_| STATES[rng.random_range(0..6)])
                    .collect();
                self.terms.prepare(slot, |label| states[label as usize]);
                for (v, &state) in self.vectors.iter_mut().zip(&states) {
                    v.prepare(qubit, state);
                }
            }
            return;
        }
        match rng.random_range(0..9) {
            0..3 => {
                let x: usize = rng.random_range(0..1 << r);
                let z = rng.random_range(0..1 << r);
                // Three in four unitary, so that the terms live a while.
                let hermitian = (x & z).count_ones() as u8 & 1;
                let unitary = u8::from(rng.random_bool(0.75));
                let phase = hermitian ^ unitary ^ (2 * rng.random_range(0..2u8));
                self.terms
                    .primitive(phase, &self.layout.mask(x), &self.layout.mask(z));
                for v in &mut self.vectors {
                    v.primitive(phase, x, z);
                }
                for (i, idle) in self.idle.iter_mut().enumerate() {
                    *idle &= x >> i & 1 == 0;
                }
            }
            3 => {
                let target = rng.random_range(0..r);
                if target != qubit {
                    self.terms.controlled_not(slot, self.layout.0[target]);
                    for v in &mut self.vectors {
                        v.controlled_not(qubit, target);
                    }
                    self.idle[target] &= self.idle[qubit];
                }
            }
            4 => {
                let powers: Vec<u8> = self.vectors.iter().map(|_| rng.random()).collect();
                self.terms.diagonal(slot, |label| powers[label as usize]);
                for (v, &power) in self.vectors.iter_mut().zip(&powers) {
                    v.diagonal(qubit, power % 4);
                }
            }
            5 => {
                let qubits = [qubit, rng.random_range(0..r), rng.random_range(0..r)];
                let phases: Vec<_> = self.vectors.iter().map(|_| random_phase(rng)).collect();
                self.terms
                    .quadratic(qubits.map(|q| self.layout.0[q]), |l| phases[l as usize]);
                for (v, &phase) in self.vectors.iter_mut().zip(&phases) {
                    v.quadratic(qubits, phase);
                }
            }
            6 => {
                self.terms.flip(slot);
                for v in &mut self.vectors {
                    v.flip(qubit);
                }
                self.idle[qubit] = false;
            }
            7 => {
                let value = rng.random();
                self.terms.measured(slot, value);
                for v in &mut self.vectors {
                    v.measured(qubit, value);
                }
                self.idle[qubit] = true;
            }
            _ => {
                let numbers: Vec<_> = (0..self.vectors.len())
                    .map(|_| Complex64::from_polar(rng.random_range(0.9..1.1), rng.random()))
                    .collect();
                self.terms.scale(|label| numbers[label as usize]);
                for (v, &number) in self.vectors.iter_mut().zip(&numbers) {
                    v.scale(number);
                }
            }
        }
    }
}

/// Runs sequences and compares everything after every step.
fn check<const W: usize>(r: usize, capacity: usize, count: usize, steps: usize, seed: u64) {
    let mut rng = Pcg64Mcg::seed_from_u64(seed);
    let mut pair = Pair::<W>::new(r, capacity, count, &mut rng);
    for _ in 0..steps {
        pair.step(&mut rng);
        compare(&pair.terms, &pair.layout, &pair.vectors, 1e-12);
        // Start over before rounding in the reference grows to the tolerance.
        let size: f64 = pair.vectors.iter().map(|v| v.norm_squared()).sum();
        if pair.terms.is_empty() || !(1e-6..1e3).contains(&size) {
            pair.reset(count, &mut rng);
        }
    }
}

#[test]
fn one_word() {
    for r in 1..=5 {
        for seed in 0..20 {
            check::<1>(r, r + seed as usize, 3, 150, seed);
            check::<1>(r, 64, 1, 100, 100 + seed);
        }
    }
}

#[test]
fn two_words() {
    for r in 1..=5 {
        for seed in 0..10 {
            check::<2>(r, 100 + seed as usize, 3, 150, seed);
        }
    }
}

#[test]
fn four_words() {
    for r in 1..=5 {
        for seed in 0..10 {
            check::<4>(r, 256, 3, 150, seed);
        }
    }
}

#[test]
fn more_slots() {
    for r in 6..=8 {
        for seed in 0..4 {
            check::<1>(r, 40, 2, 120, seed);
            check::<2>(r, 128, 2, 120, seed);
            check::<4>(r, 200, 2, 120, seed);
        }
    }
}

#[test]
fn many_terms() {
    check::<1>(3, 3, 200, 100, 1);
    check::<2>(4, 70, 100, 60, 2);
}
