//! Stabilisers whose sign is the same in every run, and coordinates of axes.
//!
//! With C a Clifford frame, some of its columns are *certain*: for these j the
//! state satisfies g·ρ = ρ, g = C·Z_j·C†, whatever faults happened and whatever
//! outcomes were drawn. At the start C = 1 and every column is. An operation
//! that does not commute with some certain g leaves the subgroup that commutes
//! with it: with J the certain columns whose g anticommutes with an axis, and p
//! one of them, controlled NOTs from p onto the rest of J turn their Z_j into
//! Z_j·Z_p, which commutes, and p is certain no more. A reset adds a column.
//!
//! A Pauli P has the coordinates C†PC. Gates change C and leave the coordinates
//! of what is carried along with them alone; a change of basis from the right
//! changes C and all coordinates.

use std::collections::BTreeMap;

use smallvec::smallvec;

use crate::circuit::{Clifford, Pauli, PauliProduct};
use crate::clifford::frame::Frame;
use crate::clifford::pauli::{PauliString, bit, toggle, words_for};
use crate::program::axis::ones_and;

/// The frame, its certain columns, and the coordinates of open axes.
#[derive(Debug)]
pub(super) struct Known {
    frame: Frame,
    certain: Vec<u64>,
    /// Coordinates of axes, sign included, by row.
    axes: BTreeMap<usize, PauliString>,
}

/// What an axis is in this state.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(super) enum Relation {
    /// Its value is known, the same in every run.
    Known,
    /// It acts on the state as the axis of this row, or its negative.
    Row { row: usize, negative: bool },
    /// Neither.
    New,
}

/// A change of basis C ← C·W.
enum Change {
    /// W: the string, where the column is 1.
    Controlled(usize, PauliString),
    /// W = H on a column.
    Hadamard(usize),
    /// W = a Pauli string.
    Pauli(PauliString),
    /// W = (1 + K)/√2, K² = −1.
    Rotate(PauliString),
}

impl Known {
    pub(super) fn new(qubits: usize) -> Known {
        let mut certain = vec![0; words_for(qubits)];
        (0..qubits).for_each(|column| toggle(&mut certain, column));
        Known {
            frame: Frame::identity(qubits),
            certain,
            axes: BTreeMap::new(),
        }
    }

    /// A gate outside any condition.
    pub(super) fn apply(&mut self, gate: &Clifford) {
        self.frame.apply(gate);
    }

    /// Follows an axis as this row from here on.
    pub(super) fn follow(&mut self, row: usize, axis: &PauliProduct) {
        self.axes.insert(row, self.frame.pull_back(axis));
    }

    /// No longer follows a row.
    pub(super) fn forget(&mut self, row: usize) {
        self.axes.remove(&row);
    }

    /// What an axis is: known, or the axis of one of the rows that `may` take it.
    pub(super) fn relation(&self, axis: &PauliProduct, may: impl Fn(usize) -> bool) -> Relation {
        let pulled = self.frame.pull_back(axis);
        let outside = |z: &[u64], other: Option<&[u64]>| {
            z.iter().enumerate().all(|(word, &z)| {
                let other = other.map_or(0, |other| other[word]);
                (z ^ other) & !self.certain[word] == 0
            })
        };
        if pulled.x.iter().all(|&word| word == 0) && outside(&pulled.z, None) {
            return Relation::Known;
        }
        for (&row, string) in &self.axes {
            if string.x == pulled.x && outside(&string.z, Some(&pulled.z)) && may(row) {
                // Z on certain columns: its value is its sign.
                let mut product = string.clone();
                product.multiply(&pulled);
                let negative = product.negative();
                return Relation::Row { row, negative };
            }
        }
        Relation::New
    }

    /// Whether a product of letters commutes with every certain stabiliser.
    pub(super) fn commutes(&self, axis: &PauliProduct) -> bool {
        let pulled = self.frame.pull_back(axis);
        pulled.x.iter().zip(&self.certain).all(|(a, b)| a & b == 0)
    }

    /// Whether no stabiliser is certain.
    pub(super) fn is_empty(&self) -> bool {
        self.certain.iter().all(|&word| word == 0)
    }

    /// Whether the qubit is certainly |0⟩.
    pub(super) fn is_zero(&self, qubit: u32) -> bool {
        let pulled = self.frame.pull_back(&smallvec![(qubit, Pauli::Z)]);
        let known = self.certain.iter().zip(&pulled.z).all(|(c, z)| z & !c == 0);
        known && pulled.x.iter().all(|&word| word == 0) && !pulled.negative()
    }

    /// Keeps the certain stabilisers that commute with a product of letters.
    pub(super) fn keep_commuting(&mut self, axis: &PauliProduct) {
        let pulled = self.frame.pull_back(axis);
        let mut hit = ones_and(&pulled.x, &self.certain);
        let Some(pivot) = hit.next() else {
            return;
        };
        let mut others = PauliString::identity(self.frame.qubits());
        hit.for_each(|column| toggle(&mut others.x, column));
        if !others.is_identity() {
            self.change(&Change::Controlled(pivot, others));
        }
        toggle(&mut self.certain, pivot);
    }

    /// The qubit has just been reset: keeps what does not involve it, and Z of
    /// it is certain.
    pub(super) fn reset(&mut self, qubit: u32) {
        let axis: PauliProduct = smallvec![(qubit, Pauli::Z)];
        self.forget_qubit(qubit);
        let pulled = self.frame.pull_back(&axis);
        let uncertain: Vec<u64> = self.certain.iter().map(|word| !word).collect();
        let column = match ones_and(&pulled.x, &uncertain).next() {
            Some(column) => column,
            None => {
                // Z_q anticommutes with X_q, with which all that is certain
                // commutes, so it is not a product of certain columns.
                let Some(column) = ones_and(&pulled.z, &uncertain).next() else {
                    debug_assert!(false, "Z of a qubit is outside what does not involve it");
                    return;
                };
                self.change(&Change::Hadamard(column));
                column
            }
        };
        let pulled = self.frame.pull_back(&axis);
        let mut z = PauliString::identity(self.frame.qubits());
        toggle(&mut z.z, column);
        let negative = pulled.negative();
        let mut generator = z.clone();
        generator.multiply(&pulled.unsigned());
        // (Z_j + P')/√2 = Z_j·(1 + Z_jP')/√2 turns Z_j into P'.
        self.change(&Change::Pauli(z));
        self.change(&Change::Rotate(generator));
        if negative {
            let mut x = PauliString::identity(self.frame.qubits());
            toggle(&mut x.x, column);
            self.change(&Change::Pauli(x));
        }
        toggle(&mut self.certain, column);
        debug_assert!(self.is_zero(qubit));
    }

    /// Keeps the certain stabilisers that do not involve a qubit.
    pub(super) fn forget_qubit(&mut self, qubit: u32) {
        self.keep_commuting(&smallvec![(qubit, Pauli::X)]);
        self.keep_commuting(&smallvec![(qubit, Pauli::Z)]);
    }

    fn change(&mut self, change: &Change) {
        match change {
            Change::Controlled(column, string) => self.frame.controlled_right(*column, string),
            Change::Hadamard(column) => self.frame.hadamard_right(*column),
            Change::Pauli(string) => self.frame.pauli_right(string),
            Change::Rotate(generator) => self.frame.rotate_right(generator),
        }
        self.axes
            .values_mut()
            .for_each(|string| change.conjugate(string));
    }
}

impl Change {
    /// P ← W†PW, as the frame does to its rows.
    fn conjugate(&self, string: &mut PauliString) {
        match self {
            Change::Controlled(column, target) => {
                let (with_control, with_target) =
                    (bit(&string.x, *column), string.anticommutes(target));
                if with_target {
                    string.phase ^= 2 * u8::from(with_control);
                    // Z from the right: it stands where it is stored.
                    toggle(&mut string.z, *column);
                }
                if with_control {
                    string.multiply(target);
                }
            }
            Change::Hadamard(column) => {
                let (x, z) = (bit(&string.x, *column), bit(&string.z, *column));
                if x != z {
                    toggle(&mut string.x, *column);
                    toggle(&mut string.z, *column);
                }
                string.phase ^= 2 * u8::from(x && z);
            }
            Change::Pauli(pauli) => string.phase ^= 2 * u8::from(string.anticommutes(pauli)),
            Change::Rotate(generator) => {
                if string.anticommutes(generator) {
                    string.multiply(generator);
                }
            }
        }
    }
}

#[cfg(test)]
mod tests {
    use rand::{RngExt, SeedableRng};
    use rand_pcg::Pcg64;

    use super::*;
    use crate::clifford::pauli::ones;

    /// Followed axes have the coordinates the frame gives them after any mix of
    /// gates and changes of basis, and certain columns stay certain: on |0…0⟩
    /// with gates only, every row of the frame's own start is known.
    #[test]
    fn coordinates_follow_the_frame() {
        let mut rng = Pcg64::seed_from_u64(11);
        let qubits = 5u32;
        for _ in 0..200 {
            let mut known = Known::new(qubits as usize);
            // A followed axis that starts as P and is carried by the gates.
            let mut axes: Vec<PauliProduct> = Vec::new();
            for step in 0..60 {
                let q = rng.random_range(0..qubits);
                let other = (q + rng.random_range(1..qubits)) % qubits;
                match rng.random_range(0..6) {
                    0 => known.keep_commuting(&smallvec![(q, Pauli::Y), (other, Pauli::X)]),
                    1 => {
                        // Followed rows must not involve the qubit.
                        known.axes.clear();
                        axes.clear();
                        known.reset(q);
                        assert!(known.is_zero(q));
                    }
                    2 if axes.len() < 4 => {
                        let axis: PauliProduct = smallvec![(q, Pauli::Z), (other, Pauli::Y)];
                        known.follow(axes.len(), &axis);
                        axes.push(axis);
                    }
                    // Gates that leave the axes of the test alone in the lab.
                    _ => known.keep_commuting(&smallvec![(other, Pauli::Z)]),
                }
                for (row, axis) in axes.iter().enumerate() {
                    assert_eq!(known.axes[&row], known.frame.pull_back(axis), "step {step}");
                }
            }
        }
        let mut known = Known::new(3);
        for gate in [Clifford::H(0), Clifford::Cx(0, 1), Clifford::Cx(1, 2)] {
            known.apply(&gate);
        }
        let xxx: PauliProduct = (0..3).map(|q| (q, Pauli::X)).collect();
        assert_eq!(known.relation(&xxx, |_| true), Relation::Known);
        known.follow(7, &smallvec![(0, Pauli::Z)]);
        known.keep_commuting(&smallvec![(0, Pauli::Z)]);
        let minus: PauliProduct = smallvec![(2, Pauli::Z)];
        let same = Relation::Row {
            row: 7,
            negative: false,
        };
        assert_eq!(known.relation(&minus, |_| true), same);
        assert_eq!(known.relation(&minus, |_| false), Relation::New);
        known.apply(&Clifford::X(2));
        let opposite = Relation::Row {
            row: 7,
            negative: true,
        };
        assert_eq!(known.relation(&minus, |_| true), opposite);
        assert_eq!(known.relation(&xxx, |_| true), Relation::New);
        assert_eq!(ones(&known.certain).count(), 2);
    }
}
