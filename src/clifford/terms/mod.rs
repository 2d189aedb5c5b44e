#![doc = include_str!("derivation.md")]
//!
//! This module knows nothing of Clifford frames, circuits or random numbers.

pub(crate) mod bits;
pub(crate) mod matrix;
mod operation;
pub(crate) mod phase;
mod quadratic;
mod sweep;
pub(crate) mod term;

#[cfg(test)]
pub(crate) mod tests;

use num_complex::Complex64;

use super::kernels::Level;
use crate::magic::Stabiliser;

pub use operation::{Candidate, Chosen, Operation, Planes, Release, Resolved, Sums, Turn};
pub use quadratic::QuadraticPhase;

use bits::Bits;
use matrix::{Matrix, stride_of};
use term::{Head, Term};

/// A set of slots: bit s mod 64 of word s / 64 stands for slot s.
pub type Mask<const W: usize> = [u64; W];

/// A list of phase-sensitive stabiliser states with weights, the *terms* of
/// one sum Ω = Σ_j φ_j, on the same slots.
///
/// Slots are numbered from 0 to the capacity. A slot is *idle* in a term if
/// it is in |0⟩, in a product with everything else. Every method keeps the
/// order of the terms; those projected to zero are dropped, so that an index
/// is only good until the next operation, whereas a label stays.
///
/// Weights and phases are exact but for the rounding of the weights given:
/// powers of √2 and of e^{iπ/4} are counted, not multiplied.
///
/// # Panics
///
/// Methods panic on an index or slot that is not below the length or capacity.
#[derive(Debug, Clone)]
pub struct Terms<const W: usize> {
    slots: usize,
    heads: Vec<Head<W>>,
    /// A matrix of `stride` rows a term.
    rows: Vec<u64>,
    stride: usize,
    level: Level,
}

impl<const W: usize> Terms<W> {
    /// No terms yet, on this many slots.
    ///
    /// # Panics
    ///
    /// If there are more than 64·W slots.
    pub fn new(slots: usize) -> Self {
        Self::with_level(slots, Level::widest())
    }

    /// The same, with the instructions of a level.
    pub fn with_level(slots: usize, level: Level) -> Self {
        assert!(
            slots <= 64 * W,
            "{slots} slots do not fit into {W} words of 64"
        );
        Self {
            slots,
            heads: Vec::new(),
            rows: Vec::new(),
            stride: stride_of(slots),
            level,
        }
    }

    /// Starts over with the terms weight_j·|0…0⟩, labelled 0, 1, 2, … Memory
    /// is used again.
    ///
    /// # Panics
    ///
    /// If there are more than 2³² weights.
    pub fn reset(&mut self, weights: &[Complex64]) {
        assert!(
            u32::try_from(weights.len()).is_ok(),
            "more than 2^32 - 1 terms"
        );
        self.heads.clear();
        self.heads.extend(
            (0..)
                .zip(weights)
                .map(|(label, &weight)| Head::new(weight, label)),
        );
        // Rows are written before they are read: no need to clear them.
        self.rows.resize(self.words() * weights.len(), 0);
    }

    /// The same with terms that have a phase e^{iπ/4·eighths} and a number of
    /// factors 0 that wait, given by label.
    ///
    /// # Panics
    ///
    /// If there are more than 2³² terms.
    pub fn reset_with(
        &mut self,
        terms: usize,
        mut choose: impl FnMut(usize) -> (Complex64, u8, u16),
    ) {
        assert!(u32::try_from(terms).is_ok(), "more than 2^32 - 1 terms");
        self.heads.clear();
        self.heads.extend((0..terms).map(|label| {
            let (weight, eighths, blocked) = choose(label);
            let mut head = Head::new(weight, label as u32);
            head.factor.turn_eighths(eighths);
            head.blocked = blocked;
            head
        }));
        self.rows.resize(self.words() * terms, 0);
    }

    /// The capacity in slots.
    pub fn slots(&self) -> usize {
        self.slots
    }

    /// The instructions its passes use.
    pub fn level(&self) -> Level {
        self.level
    }

    /// Changes them.
    #[cfg(test)]
    pub(crate) fn set_level(&mut self, level: Level) {
        self.level = level;
    }

    /// How many terms are left.
    pub fn len(&self) -> usize {
        self.heads.len()
    }

    /// Whether no term is left.
    pub fn is_empty(&self) -> bool {
        self.heads.is_empty()
    }

    /// Which of the terms of the last [`reset`](Self::reset) this is.
    pub fn label(&self, index: usize) -> u32 {
        self.heads[index].label
    }

    /// Turns idle |0⟩ into |+⟩, in all terms. The slot must be idle in all of
    /// them.
    pub fn plus(&mut self, slot: usize) {
        self.prepare(slot, |_| Stabiliser::Plus);
    }

    /// Turns idle |0⟩ into the state chosen for the label. The slot must be
    /// idle in all terms.
    pub fn prepare(&mut self, slot: usize, mut choose: impl FnMut(u32) -> Stabiliser) {
        self.check(slot);
        self.each(|mut term| {
            debug_assert!(term.is_idle(slot), "slot {slot} is in use");
            let state = choose(term.head.label);
            term.prepare(slot, state);
        });
    }

    /// Every term ← (1 + i^phase·X^x Z^z)/√2 · term, where X^x stands to the
    /// left: Q|y⟩ = i^phase·(−1)^{z·y}|y ⊕ x⟩.
    ///
    /// A Q with Q² = −1 makes this a Clifford gate, with Q² = 1 √2 times a
    /// projector; terms it annihilates are dropped.
    pub fn primitive(&mut self, phase: u8, x: &Mask<W>, z: &Mask<W>) {
        let (x, z) = (Bits(*x), Bits(*z));
        assert!(
            ((x | z) & !Bits::first(self.slots)).is_zero(),
            "the operator reaches beyond the capacity of {} slots",
            self.slots
        );
        self.retain(|mut term| term.primitive(phase & 3, x, z));
    }

    /// CNOT on every term.
    ///
    /// # Panics
    ///
    /// If control and target are the same.
    pub fn controlled_not(&mut self, control: usize, target: usize) {
        self.check(control);
        self.check(target);
        assert_ne!(control, target, "control and target are the same slot");
        self.each(|mut term| term.controlled_not(control, target));
    }

    /// diag(1, i^p) on a slot, the power p chosen for the label.
    pub fn diagonal(&mut self, slot: usize, mut choose: impl FnMut(u32) -> u8) {
        self.check(slot);
        self.each(|mut term| {
            let power = choose(term.head.label);
            term.diagonal(slot, power);
        });
    }

    /// Signs that are quadratic in the bits of three slots, chosen for the
    /// label.
    pub fn quadratic(&mut self, slots: [usize; 3], mut choose: impl FnMut(u32) -> QuadraticPhase) {
        for slot in slots {
            self.check(slot);
        }
        self.each(|mut term| {
            let phase = choose(term.head.label);
            term.quadratic(slots, phase);
        });
    }

    /// Controlled Z between two slots.
    pub fn controlled_z(&mut self, a: usize, b: usize) {
        let phase = QuadraticPhase {
            cz: [true, false, false],
            ..QuadraticPhase::default()
        };
        self.quadratic([a, b, b], |_| phase);
    }

    /// Multiplies by the number chosen for the label. Powers of √2 collected
    /// so far are folded into the weights, so that normalising from time to
    /// time keeps them in range.
    pub fn scale(&mut self, mut choose: impl FnMut(u32) -> Complex64) {
        for head in &mut self.heads {
            head.factor.scale(choose(head.label));
        }
    }

    /// X on a slot.
    pub fn flip(&mut self, slot: usize) {
        self.check(slot);
        self.each(|mut term| term.flip(slot));
    }

    /// Projects on Z_slot = (−1)^value without normalising, drops the terms
    /// it annihilates, and leaves the slot idle in |0⟩.
    pub fn measured(&mut self, slot: usize, value: bool) {
        self.check(slot);
        self.retain(|mut term| term.measured(slot, value));
    }

    /// The value of Z_slot in a term if it is certain, `None` if both
    /// outcomes have probability 1/2.
    pub fn certain(&self, index: usize, slot: usize) -> Option<bool> {
        self.check(slot);
        let head = &self.heads[index];
        let free = !head.dependence(&self.matrix(index), slot).is_zero();
        (!free).then(|| head.shift.has(slot))
    }

    /// ⟨x|φ⟩ for a term φ; idle slots are |0⟩.
    pub fn amplitude(&self, index: usize, x: &Mask<W>) -> Complex64 {
        self.heads[index].amplitude(&self.matrix(index), Bits(*x))
    }

    /// ⟨x|Ω⟩, the sum of the amplitudes of all terms.
    pub fn total_amplitude(&self, x: &Mask<W>) -> Complex64 {
        let x = Bits(*x);
        self.views()
            .map(|(head, rows)| head.amplitude(&rows, x))
            .sum()
    }

    /// ‖φ‖² of a term.
    pub fn norm_squared(&self, index: usize) -> f64 {
        self.heads[index].factor.norm_squared()
    }

    /// Bytes a term takes.
    pub fn bytes_per_term(&self) -> usize {
        size_of::<Head<W>>() + self.words() * size_of::<u64>()
    }

    /// The terms, for reading.
    pub(crate) fn views(&self) -> impl Iterator<Item = (&Head<W>, Matrix<&[u64], W>)> {
        (0..self.len()).map(|index| (&self.heads[index], self.matrix(index)))
    }

    /// Words of a matrix.
    fn words(&self) -> usize {
        W * self.stride
    }

    fn matrix(&self, index: usize) -> Matrix<&[u64], W> {
        let words = self.words();
        Matrix::new(&self.rows[index * words..][..words], self.stride)
    }

    fn check(&self, slot: usize) {
        assert!(
            slot < self.slots,
            "slot {slot} is not below the capacity {}",
            self.slots
        );
    }

    /// Changes every term.
    #[inline(always)]
    fn each(&mut self, mut change: impl FnMut(Term<W>)) {
        let words = self.words();
        let mut rows = &mut self.rows[..];
        for head in &mut self.heads {
            let (own, others) = rows.split_at_mut(words);
            let rows_of_term = Matrix::new(own, self.stride);
            change(Term {
                head,
                rows: rows_of_term,
            });
            rows = others;
        }
    }

    /// Changes every term and keeps those for which `change` says so.
    #[inline(always)]
    fn retain(&mut self, mut change: impl FnMut(Term<W>) -> bool) {
        let words = self.words();
        let mut kept = 0;
        for index in 0..self.heads.len() {
            let start = index * words;
            let term = Term {
                head: &mut self.heads[index],
                rows: Matrix::new(&mut self.rows[start..start + words], self.stride),
            };
            if !change(term) {
                continue;
            }
            if kept != index {
                self.heads[kept] = self.heads[index];
                self.rows.copy_within(start..start + words, kept * words);
            }
            kept += 1;
        }
        self.heads.truncate(kept);
    }
}
