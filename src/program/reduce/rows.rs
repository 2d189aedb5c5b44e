//! Open axes, carried along the circuit: one row of letters each.
//!
//! A row is the Pauli R at the present place for which a rotation about R here
//! equals the rotation about the row's own axis at its place. Rows are stored
//! by qubit, one bit a row, so that a gate or a channel costs a few words
//! however many rows and qubits there are. Signs are not kept here.

use crate::circuit::{Clifford, Pauli, PauliProduct};

const WORDS: usize = 16;

/// Most rows at a time.
pub(super) const MAX_ROWS: usize = 64 * WORDS;

/// Rows made free at once when all are in use, by giving up the oldest.
const MADE_FREE: usize = MAX_ROWS / 4;

/// A set of rows.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(super) struct Mask([u64; WORDS]);

impl Mask {
    pub(super) const EMPTY: Mask = Mask([0; WORDS]);

    fn one(row: usize) -> Mask {
        let mut mask = Mask::EMPTY;
        mask.0[row / 64] = 1 << (row % 64);
        mask
    }

    fn with(mut self, other: &Mask, combine: impl Fn(u64, u64) -> u64) -> Mask {
        for (a, b) in self.0.iter_mut().zip(&other.0) {
            *a = combine(*a, *b);
        }
        self
    }

    pub(super) fn and(self, other: &Mask) -> Mask {
        self.with(other, |a, b| a & b)
    }

    pub(super) fn or(self, other: &Mask) -> Mask {
        self.with(other, |a, b| a | b)
    }

    pub(super) fn xor(self, other: &Mask) -> Mask {
        self.with(other, |a, b| a ^ b)
    }

    pub(super) fn without(self, other: &Mask) -> Mask {
        self.with(other, |a, b| a & !b)
    }

    pub(super) fn is_empty(&self) -> bool {
        self.0 == [0; WORDS]
    }

    pub(super) fn contains(&self, row: usize) -> bool {
        self.0[row / 64] >> (row % 64) & 1 == 1
    }

    pub(super) fn rows(&self) -> impl Iterator<Item = usize> + '_ {
        crate::clifford::pauli::ones(&self.0)
    }
}

/// All rows.
#[derive(Debug)]
pub(super) struct Rows {
    x: Vec<Mask>,
    z: Vec<Mask>,
    /// Rows still carried, up to a sign that may differ from run to run.
    carried: Mask,
    /// Those of them whose sign is the same in every run.
    signed: Mask,
    /// Rows known to have a single letter.
    lone: Mask,
    /// Rows whose bits are 0, last one first to be used.
    free: Vec<usize>,
    /// Rows in use, oldest first.
    order: Vec<usize>,
}

impl Rows {
    pub(super) fn new(qubits: usize) -> Rows {
        Rows {
            x: vec![Mask::EMPTY; qubits],
            z: vec![Mask::EMPTY; qubits],
            carried: Mask::EMPTY,
            signed: Mask::EMPTY,
            lone: Mask::EMPTY,
            free: (0..MAX_ROWS).rev().collect(),
            order: Vec::new(),
        }
    }

    pub(super) fn carried(&self) -> &Mask {
        &self.carried
    }

    pub(super) fn signed(&self) -> &Mask {
        &self.signed
    }

    /// Starts a row. If all are in use the oldest are given up.
    pub(super) fn open(&mut self, axis: &PauliProduct) -> usize {
        if self.free.is_empty() {
            self.make_free();
        }
        let row = self.free.pop().expect("rows were made free");
        let mask = Mask::one(row);
        for &(qubit, letter) in axis {
            let qubit = qubit as usize;
            if letter.x() {
                self.x[qubit] = self.x[qubit].or(&mask);
            }
            if letter.z() {
                self.z[qubit] = self.z[qubit].or(&mask);
            }
        }
        self.carried = self.carried.or(&mask);
        self.signed = self.signed.or(&mask);
        if axis.len() == 1 {
            self.lone = self.lone.or(&mask);
        }
        self.order.push(row);
        row
    }

    fn make_free(&mut self) {
        let open = self.carried.rows().count();
        let excess = (open + MADE_FREE).saturating_sub(MAX_ROWS);
        let mut given_up = 0;
        for &row in &self.order {
            if given_up < excess && self.carried.contains(row) {
                self.carried = self.carried.without(&Mask::one(row));
                given_up += 1;
            }
        }
        let carried = self.carried;
        self.signed = self.signed.and(&carried);
        self.lone = self.lone.and(&carried);
        for letters in self.x.iter_mut().chain(&mut self.z) {
            *letters = letters.and(&carried);
        }
        let free = &mut self.free;
        self.order.retain(|&row| {
            let kept = carried.contains(row);
            if !kept {
                free.push(row);
            }
            kept
        });
    }

    /// Gives rows up.
    pub(super) fn close(&mut self, rows: &Mask) {
        self.carried = self.carried.without(rows);
        self.signed = self.signed.without(rows);
    }

    /// From here the sign of these rows may differ from run to run.
    pub(super) fn taint(&mut self, rows: &Mask) {
        self.signed = self.signed.without(rows);
    }

    /// Rows that anticommute with a product of letters.
    pub(super) fn anticommuting(&self, axis: &PauliProduct) -> Mask {
        let mut rows = Mask::EMPTY;
        for &(qubit, letter) in axis {
            if letter.z() {
                rows = rows.xor(&self.x[qubit as usize]);
            }
            if letter.x() {
                rows = rows.xor(&self.z[qubit as usize]);
            }
        }
        rows.and(&self.carried)
    }

    /// Rows with any letter on a qubit.
    pub(super) fn on(&self, qubit: u32) -> Mask {
        let qubit = qubit as usize;
        self.x[qubit].or(&self.z[qubit]).and(&self.carried)
    }

    /// Rows with X or Y on a qubit, and rows with Z there.
    pub(super) fn letters(&self, qubit: u32) -> (Mask, Mask) {
        let (x, z) = (&self.x[qubit as usize], &self.z[qubit as usize]);
        (x.and(&self.carried), z.without(x).and(&self.carried))
    }

    /// Those of the rows that may have more than one letter.
    pub(super) fn wide(&self, rows: &Mask) -> Mask {
        rows.without(&self.lone)
    }

    /// Takes the letter on a qubit out of every row.
    pub(super) fn erase(&mut self, qubit: u32) {
        self.x[qubit as usize] = Mask::EMPTY;
        self.z[qubit as usize] = Mask::EMPTY;
    }

    /// R becomes GRG†, without its sign.
    pub(super) fn apply(&mut self, gate: &Clifford) {
        let (x, z) = (&mut self.x, &mut self.z);
        match *gate {
            Clifford::X(_) | Clifford::Y(_) | Clifford::Z(_) => {}
            Clifford::H(q) => std::mem::swap(&mut x[q as usize], &mut z[q as usize]),
            Clifford::S(q) | Clifford::Sdg(q) => {
                z[q as usize] = z[q as usize].xor(&x[q as usize]);
            }
            Clifford::Cx(control, target) => {
                let (c, t) = (control as usize, target as usize);
                x[t] = x[t].xor(&x[c]);
                z[c] = z[c].xor(&z[t]);
                self.spread(c, t);
            }
            Clifford::Cz(a, b) => {
                let (a, b) = (a as usize, b as usize);
                z[a] = z[a].xor(&x[b]);
                z[b] = z[b].xor(&x[a]);
                self.spread(a, b);
            }
            Clifford::Swap(a, b) => {
                x.swap(a as usize, b as usize);
                z.swap(a as usize, b as usize);
            }
            Clifford::QuarterTurn(ref axis) => self.turn(axis),
        }
    }

    /// Rows with letters on both qubits are no longer lone.
    fn spread(&mut self, a: usize, b: usize) {
        let both = (self.x[a].or(&self.z[a])).and(&self.x[b].or(&self.z[b]));
        self.lone = self.lone.without(&both);
    }

    /// A row that anticommutes with the axis becomes their product.
    fn turn(&mut self, axis: &PauliProduct) {
        let rows = self.anticommuting(axis);
        for &(qubit, letter) in axis {
            let qubit = qubit as usize;
            if letter.x() {
                self.x[qubit] = self.x[qubit].xor(&rows);
            }
            if letter.z() {
                self.z[qubit] = self.z[qubit].xor(&rows);
            }
        }
        if axis
            .iter()
            .filter(|(_, letter)| *letter != Pauli::I)
            .count()
            > 1
        {
            self.lone = self.lone.without(&rows);
        }
    }
}
