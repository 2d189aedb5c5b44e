//! A density matrix on a few qubits.
//!
//! Entry ⟨r|ρ|c⟩ of n qubits stands at an index of 2n bits: bit 2p is bit p of
//! r, bit 2p + 1 is bit p of c. A qubit that joins or leaves at the top then
//! leaves the rest where it is, and an operator on one qubit mixes four entries
//! that differ in two neighbouring bits only.
//!
//! Every operation builds the new entries from the old ones, in parallel where
//! there are many. Knows nothing of circuits or classical bits.

use num_complex::Complex64;
use rayon::prelude::*;

/// A linear map on one-qubit matrices: entry `[a][b]` leads from old entry b to
/// new entry a, both numbered row + 2·column.
pub(super) type Map = [[Complex64; 4]; 4];

/// A Hermitian Pauli string on positions of a matrix.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(super) struct Letters {
    /// X parts; bit 2p for position p.
    pub x: usize,
    /// Z parts, likewise.
    pub z: usize,
    /// Number of Y mod 4.
    pub y: u8,
}

/// An unnormalised density matrix.
#[derive(Debug, Clone, PartialEq)]
pub(super) struct Density {
    entries: Vec<Complex64>,
}

/// Entries a thread takes at a time.
const GRAIN: usize = 1 << 13;

fn odd(bits: usize) -> bool {
    bits.count_ones() & 1 == 1
}

fn signed(negative: bool, value: Complex64) -> Complex64 {
    if negative { -value } else { value }
}

fn i_power(power: u8) -> Complex64 {
    [Complex64::ONE, Complex64::I, -Complex64::ONE, -Complex64::I][usize::from(power & 3)]
}

/// Σ K·ρ·K† as a map.
pub(super) fn kraus(operators: &[[[Complex64; 2]; 2]]) -> Map {
    let entry = |to: usize, from: usize| {
        operators
            .iter()
            .map(|k| k[to & 1][from & 1] * k[to >> 1][from >> 1].conj())
            .sum()
    };
    std::array::from_fn(|to| std::array::from_fn(|from| entry(to, from)))
}

impl Density {
    /// The matrix of no qubits, of this trace.
    pub fn scalar(trace: f64) -> Self {
        Density {
            entries: vec![trace.into()],
        }
    }

    /// Number of entries.
    pub fn len(&self) -> usize {
        self.entries.len()
    }

    /// The trace.
    pub fn trace(&self) -> f64 {
        // Row and column agree where each pair of bits is 00 or 11.
        let low = 0x5555_5555_5555_5555_u64 as usize;
        let diagonal = |index: usize| index & low == index >> 1 & low;
        (0..self.len())
            .filter(|&index| diagonal(index))
            .map(|index| self.entries[index].re)
            .sum()
    }

    /// Adds another matrix of the same size.
    pub fn add(&mut self, other: &Density) {
        self.entries
            .iter_mut()
            .zip(&other.entries)
            .for_each(|(sum, value)| *sum += value);
    }

    /// Multiplies by a number.
    pub fn scale(&mut self, factor: f64) {
        self.entries.iter_mut().for_each(|value| *value *= factor);
    }

    fn build(&self, len: usize, entry: impl Fn(usize, &[Complex64]) -> Complex64 + Sync) -> Self {
        let old = &self.entries[..];
        let mut entries = Vec::with_capacity(len);
        if len <= GRAIN {
            entries.extend((0..len).map(|index| entry(index, old)));
        } else {
            let indices = (0..len).into_par_iter().with_min_len(GRAIN);
            indices
                .map(|index| entry(index, old))
                .collect_into_vec(&mut entries);
        }
        Density { entries }
    }

    /// A qubit joins in |0⟩ at the top position.
    pub fn join(&mut self) {
        self.entries.resize(4 * self.entries.len(), Complex64::ZERO);
    }

    /// The qubit at a position leaves, its state forgotten.
    pub fn traced(&self, position: usize) -> Self {
        self.build(self.len() / 4, |index, old| {
            let spread = spread(index, position);
            old[spread] + old[spread | 3 << (2 * position)]
        })
    }

    /// The qubit at a position leaves, found in `value`.
    pub fn found(&self, position: usize, value: bool) -> Self {
        let bits = if value { 3 << (2 * position) } else { 0 };
        self.build(self.len() / 4, |index, old| {
            old[spread(index, position) | bits]
        })
    }

    /// Projected on `value` of a position.
    pub fn projected(&self, position: usize, value: bool) -> Self {
        let both = 3 << (2 * position);
        let wanted = if value { both } else { 0 };
        self.build(self.len(), |index, old| {
            if index & both == wanted {
                old[index]
            } else {
                Complex64::ZERO
            }
        })
    }

    /// A map of one position.
    pub fn local(&self, position: usize, map: &Map) -> Self {
        let shift = 2 * position;
        self.build(self.len(), |index, old| {
            let row = &map[index >> shift & 3];
            let rest = index & !(3 << shift);
            (0..4)
                .map(|from| row[from] * old[rest | from << shift])
                .sum()
        })
    }

    /// CNOT.
    pub fn controlled_not(&self, control: usize, target: usize) -> Self {
        self.build(self.len(), |index, old| {
            old[index ^ (index >> (2 * control) & 3) << (2 * target)]
        })
    }

    /// Controlled Z.
    pub fn controlled_z(&self, a: usize, b: usize) -> Self {
        self.build(self.len(), |index, old| {
            let both = (index >> (2 * a)) & (index >> (2 * b)) & 3;
            signed(odd(both), old[index])
        })
    }

    /// Exchange.
    pub fn swap(&self, a: usize, b: usize) -> Self {
        self.build(self.len(), |index, old| {
            let differ = (index >> (2 * a) ^ index >> (2 * b)) & 3;
            old[index ^ differ << (2 * a) ^ differ << (2 * b)]
        })
    }

    /// Σ probability·P·ρ·P + (1 − Σ probability)·ρ.
    pub fn paulis(&self, words: &[(Letters, f64)]) -> Self {
        let rest = 1.0 - words.iter().map(|word| word.1).sum::<f64>();
        self.build(self.len(), |index, old| {
            let mut sum = old[index] * rest;
            for (word, probability) in words {
                let from = index ^ (3 * word.x);
                sum += signed(odd(from & (3 * word.z)), old[from]) * *probability;
            }
            sum
        })
    }

    /// diag(1, e^{iφ}) in the frame of P, averaged over φ so that the mean of
    /// e^{iφ} is `coherence`. With z = `coherence`:
    ///
    /// ρ → (1 + Re z)/2·ρ + (1 − Re z)/2·PρP − (i·Im z/2)·(Pρ − ρP).
    pub fn turned(&self, axis: Letters, coherence: Complex64) -> Self {
        let stay = 0.5 * (1.0 + coherence.re);
        let both = 0.5 * (1.0 - coherence.re);
        let one = -Complex64::I * (0.5 * coherence.im) * i_power(axis.y);
        let (x_row, x_column) = (axis.x, 2 * axis.x);
        let (z_row, z_column) = (axis.z, 2 * axis.z);
        self.build(self.len(), |index, old| {
            let acted = index ^ x_row ^ x_column;
            let (left, right) = (index ^ x_row, index ^ x_column);
            let from_left = signed(odd(left & z_row), old[left]);
            let from_right = signed(odd(index & z_column), old[right]);
            old[index] * stay
                + signed(odd(acted & (z_row | z_column)), old[acted]) * both
                + one * (from_left - from_right)
        })
    }

    /// Σ table[s][t]·Π_s·ρ·Π_t over the values s, t (bit i for axis i) of three
    /// commuting axes; Π_s projects on the values s.
    pub fn between_values(&self, axes: [Letters; 3], table: &[[f64; 8]; 8]) -> Self {
        if axes.iter().all(|axis| axis.x == 0) {
            return self.build(self.len(), |index, old| {
                let value = |shift: usize| {
                    let bit = |i: usize| usize::from(odd(index >> shift & axes[i].z)) << i;
                    bit(0) | bit(1) | bit(2)
                };
                old[index] * table[value(0)][value(1)]
            });
        }
        // Π_s = (1/8)·Σ_A (−1)^{A·s}·P^A turns this into products of axes.
        let mut result = self.build(self.len(), |_, _| Complex64::ZERO);
        for left in 0..8usize {
            let mut from_left = self.clone();
            for axis in (0..3).filter(|axis| left >> axis & 1 == 1) {
                from_left = from_left.left(axes[axis]);
            }
            for right in 0..8usize {
                let weight: f64 = (0..64usize)
                    .map(|both| {
                        let (s, t) = (both & 7, both >> 3);
                        let negative = odd(left & s) != odd(right & t);
                        if negative { -table[s][t] } else { table[s][t] }
                    })
                    .sum::<f64>()
                    / 64.0;
                if weight.abs() < 1e-15 {
                    continue;
                }
                let mut acted = from_left.clone();
                for axis in (0..3).filter(|axis| right >> axis & 1 == 1) {
                    acted = acted.right(axes[axis]);
                }
                acted.scale(weight);
                result.add(&acted);
            }
        }
        result
    }

    /// P·ρ.
    fn left(&self, axis: Letters) -> Self {
        let phase = i_power(axis.y);
        self.build(self.len(), |index, old| {
            let from = index ^ axis.x;
            signed(odd(from & axis.z), phase * old[from])
        })
    }

    /// ρ·P.
    fn right(&self, axis: Letters) -> Self {
        let phase = i_power(axis.y);
        self.build(self.len(), |index, old| {
            signed(odd(index & (2 * axis.z)), phase * old[index ^ (2 * axis.x)])
        })
    }
}

/// The index with two bits 0 put in at a position.
fn spread(index: usize, position: usize) -> usize {
    let low = index & ((1 << (2 * position)) - 1);
    low | (index ^ low) << 2
}
