//! The reference: 2^r amplitudes, every operation by its definition on basis
//! states. Shares no code with the terms.

use num_complex::Complex64;
use rand::{Rng, RngExt};

use crate::clifford::terms::{Mask, QuadraticPhase, Terms};
use crate::magic::Stabiliser;

/// i^n.
pub(crate) fn quarter(n: usize) -> Complex64 {
    [
        Complex64::new(1.0, 0.0),
        Complex64::new(0.0, 1.0),
        Complex64::new(-1.0, 0.0),
        Complex64::new(0.0, -1.0),
    ][n % 4]
}

/// Where the qubits of the reference sit among the slots.
#[derive(Debug, Clone)]
pub(crate) struct Layout(pub(crate) Vec<usize>);

impl Layout {
    /// r distinct slots below the capacity; at least one from each word that
    /// is in reach, so that word boundaries are met.
    pub(crate) fn random<R: Rng>(r: usize, capacity: usize, rng: &mut R) -> Self {
        let mut slots = Vec::new();
        while slots.len() < r {
            let word = slots.len() * 64;
            let slot = if word < capacity {
                rng.random_range(word..capacity.min(word + 64))
            } else {
                rng.random_range(0..capacity)
            };
            if !slots.contains(&slot) {
                slots.push(slot);
            }
        }
        for i in (1..r).rev() {
            slots.swap(i, rng.random_range(0..=i));
        }
        Self(slots)
    }

    /// Bit i of the number at the i-th slot.
    pub(crate) fn mask<const W: usize>(&self, bits: usize) -> Mask<W> {
        let mut mask = [0; W];
        for (i, slot) in self.0.iter().enumerate() {
            mask[slot / 64] |= ((bits >> i & 1) as u64) << (slot % 64);
        }
        mask
    }
}

/// A vector on r qubits, bit i of an index being qubit i.
#[derive(Debug, Clone)]
pub(crate) struct Dense(pub(crate) Vec<Complex64>);

impl Dense {
    pub(crate) fn new(qubits: usize, weight: Complex64) -> Self {
        let mut amplitudes = vec![Complex64::ZERO; 1 << qubits];
        amplitudes[0] = weight;
        Self(amplitudes)
    }

    pub(crate) fn norm_squared(&self) -> f64 {
        self.0.iter().map(|a| a.norm_sqr()).sum()
    }

    /// Π_{i: z_i = 1} over parities: Q|y⟩ = i^c (−1)^{z·y}|y ⊕ x⟩.
    pub(crate) fn primitive(&mut self, phase: u8, x: usize, z: usize) {
        let mut result = self.0.clone();
        for (y, amplitude) in self.0.iter().enumerate() {
            let turns = usize::from(phase) + 2 * (z & y).count_ones() as usize;
            result[y ^ x] += amplitude * quarter(turns);
        }
        for a in &mut result {
            *a *= std::f64::consts::FRAC_1_SQRT_2;
        }
        self.0 = result;
    }

    pub(crate) fn controlled_not(&mut self, control: usize, target: usize) {
        self.0 = (0..self.0.len())
            .map(|y| self.0[y ^ ((y >> control & 1) << target)])
            .collect();
    }

    pub(crate) fn diagonal(&mut self, qubit: usize, power: u8) {
        for (y, a) in self.0.iter_mut().enumerate() {
            *a *= quarter((y >> qubit & 1) * usize::from(power));
        }
    }

    pub(crate) fn quadratic(&mut self, qubits: [usize; 3], phase: QuadraticPhase) {
        for (y, a) in self.0.iter_mut().enumerate() {
            let bit = qubits.map(|qubit| y >> qubit & 1 == 1);
            let mut minus = phase.negative;
            minus ^= phase.z[0] && bit[0];
            minus ^= phase.z[1] && bit[1];
            minus ^= phase.z[2] && bit[2];
            minus ^= phase.cz[0] && bit[0] && bit[1];
            minus ^= phase.cz[1] && bit[1] && bit[2];
            minus ^= phase.cz[2] && bit[0] && bit[2];
            if minus {
                *a = -*a;
            }
        }
    }

    pub(crate) fn scale(&mut self, number: Complex64) {
        for a in &mut self.0 {
            *a *= number;
        }
    }

    pub(crate) fn flip(&mut self, qubit: usize) {
        self.0 = (0..self.0.len()).map(|y| self.0[y ^ 1 << qubit]).collect();
    }

    pub(crate) fn project(&mut self, qubit: usize, value: bool) {
        for (y, a) in self.0.iter_mut().enumerate() {
            if (y >> qubit & 1 == 1) != value {
                *a = Complex64::ZERO;
            }
        }
    }

    pub(crate) fn measured(&mut self, qubit: usize, value: bool) {
        self.project(qubit, value);
        if value {
            self.flip(qubit);
        }
    }

    /// The qubit must be in |0⟩.
    pub(crate) fn prepare(&mut self, qubit: usize, state: Stabiliser) {
        let [zero, one] = state.amplitudes();
        for y in 0..self.0.len() {
            if y >> qubit & 1 == 0 {
                let a = self.0[y];
                self.0[y] = a * zero;
                self.0[y | 1 << qubit] = a * one;
            }
        }
    }

    /// P(1) of a qubit.
    pub(crate) fn chance(&self, qubit: usize) -> f64 {
        let mut one = self.clone();
        one.project(qubit, true);
        one.norm_squared() / self.norm_squared()
    }
}

/// Asserts that the terms are exactly the vectors that are not zero, in
/// order, with every amplitude, norm and certain value.
#[track_caller]
pub(crate) fn compare<const W: usize>(
    terms: &Terms<W>,
    layout: &Layout,
    vectors: &[Dense],
    tolerance: f64,
) {
    let alive: Vec<usize> = (0..vectors.len())
        .filter(|&j| vectors[j].norm_squared() > 1e-12)
        .collect();
    assert_eq!(terms.len(), alive.len(), "number of terms");
    assert_eq!(terms.is_empty(), alive.is_empty());
    for (index, &j) in alive.iter().enumerate() {
        assert_eq!(terms.label(index) as usize, j);
        let dense = &vectors[j];
        for (y, expected) in dense.0.iter().enumerate() {
            let found = terms.amplitude(index, &layout.mask(y));
            assert!(
                (found - expected).norm() < tolerance,
                "term {j}, basis state {y:b}: {found} instead of {expected}"
            );
        }
        let norm = terms.norm_squared(index);
        assert!((norm - dense.norm_squared()).abs() < tolerance * norm.max(1.0));
        for (qubit, &slot) in layout.0.iter().enumerate() {
            let chance = dense.chance(qubit);
            let expected = match chance {
                c if c < 1e-9 => Some(false),
                c if c > 1.0 - 1e-9 => Some(true),
                c => {
                    assert!((c - 0.5).abs() < 1e-9);
                    None
                }
            };
            assert_eq!(terms.certain(index, slot), expected);
        }
    }
}
