//! Bringing a Pauli axis of the circuit onto one slot of the register.
//!
//! The axis P is pulled back, P' = C†PC, and one of three rules applies.
//!
//! 1. P' has an X part on an inactive column j, which is in |0⟩. Controlled
//!    Paulis with control j leave |0⟩ alone and turn P' into ±X_j; a Hadamard
//!    makes j active in |+⟩ with axis ±Z_j.
//! 2. P' is Z on inactive columns only: its value is known.
//! 3. P' acts on active columns. Its Z parts on inactive columns act trivially
//!    and are left out. With an X part on active column j, V = (1 + Z_jP')/√2
//!    maps P' to Z_j; without, CNOTs gather the Z string on one column.

use crate::circuit::{Clifford, Pauli, PauliProduct};
use crate::clifford::pauli::{PauliString, bit, ones, toggle};

use super::compile::Compiler;
use super::step::{Primitive, Step};
use super::{CompileError, MAX_SLOTS};

/// Where an axis has been brought. The sign is that of the reference frame.
pub(super) enum Gathered {
    /// Its value is known.
    Known { negative: bool },
    /// It is ±Z of this active column.
    Column { column: usize, negative: bool },
    /// It is ± the product of Z of these reserved columns.
    Reserved { columns: Vec<usize>, negative: bool },
}

impl Gathered {
    pub(super) fn negative(&self) -> bool {
        match self {
            Gathered::Known { negative }
            | Gathered::Column { negative, .. }
            | Gathered::Reserved { negative, .. } => *negative,
        }
    }
}

impl Compiler<'_> {
    /// Brings an axis onto a column that is not reserved, without disturbing Z
    /// of the reserved ones. The axis must commute with those.
    pub(super) fn gather(
        &mut self,
        axis: &PauliProduct,
        reserved: &[usize],
    ) -> Result<Gathered, CompileError> {
        let pulled = self.frame.pull_back(axis);
        let fresh = ones_and(&pulled.x, &self.inactive).next();
        if let Some(column) = fresh {
            return self.activate(axis, column);
        }
        let acting = pulled.restricted(&self.active);
        let mut rest = pulled.clone();
        rest.x.iter_mut().zip(&acting.x).for_each(|(a, b)| *a ^= b);
        rest.z.iter_mut().zip(&acting.z).for_each(|(a, b)| *a ^= b);
        // The rest is Z on columns in |0⟩; the letters of both parts sit on
        // different columns, so the sign is that of the whole.
        let negative = pulled.negative();
        if acting.is_identity() {
            return Ok(Gathered::Known { negative });
        }
        if let Some(column) = self.highest(ones(&acting.x)) {
            self.rotate_onto(column, &acting);
            return Ok(Gathered::Column { column, negative });
        }
        let free = ones(&acting.z).filter(|column| !reserved.contains(column));
        let free = self.highest(free);
        let Some(column) = free else {
            return Ok(Gathered::Reserved {
                columns: ones(&acting.z).collect(),
                negative,
            });
        };
        for other in ones(&acting.z).filter(|&other| other != column) {
            self.frame.controlled_not_right(other, column);
            let (control, target) = (self.slot(other), self.slot(column));
            self.steps.push(Step::ControlledNot { control, target });
        }
        Ok(Gathered::Column { column, negative })
    }

    /// The column in the highest slot. A measurement frees its slot: taken from
    /// the top, those still in use stay together at the bottom, which is as far as
    /// passes over the rows of a term go.
    fn highest(&self, columns: impl Iterator<Item = usize>) -> Option<usize> {
        columns.max_by_key(|&column| self.slots[column])
    }

    /// Rule 1: makes an inactive column active with the axis on its Z.
    fn activate(&mut self, axis: &PauliProduct, column: usize) -> Result<Gathered, CompileError> {
        let negative = self.straighten(axis, column);
        self.frame.hadamard_right(column);
        let slot = self.take_slot(column)?;
        self.steps.push(Step::Activate { slot });
        Ok(Gathered::Column { column, negative })
    }

    /// Turns the pulled-back axis, which has an X part on an inactive column,
    /// into ±X of that column by operators that leave |0⟩ there alone. Returns
    /// whether the sign is −.
    pub(super) fn straighten(&mut self, axis: &PauliProduct, column: usize) -> bool {
        let mut pulled = self.frame.pull_back(axis);
        if bit(&pulled.z, column) {
            self.frame.phase_right(column);
            pulled = self.frame.pull_back(axis);
        }
        let negative = pulled.negative();
        let mut target = pulled;
        toggle(&mut target.x, column);
        let target = target.unsigned();
        if !target.is_identity() {
            self.frame.controlled_right(column, &target);
        }
        negative
    }

    /// Rule 3: V = (1 + Z_jQ)/√2 on the register, V† absorbed into the frame.
    fn rotate_onto(&mut self, column: usize, axis: &PauliString) {
        let mut generator = PauliString::identity(self.frame.qubits());
        toggle(&mut generator.z, column);
        generator.multiply(axis);
        let mut primitive = Primitive {
            phase: generator.phase,
            x: [0; 4],
            z: [0; 4],
        };
        for (part, mask) in [
            (&generator.x, &mut primitive.x),
            (&generator.z, &mut primitive.z),
        ] {
            for column in ones(part) {
                toggle(mask, usize::from(self.slot(column)));
            }
        }
        self.steps
            .push(Step::Primitive(self.primitives.len() as u32));
        self.primitives.push(primitive);
        generator.phase = (generator.phase + 2) & 3;
        self.frame.rotate_right(&generator);
    }

    /// Rule 1 for a measurement of P with an X part on an inactive column:
    /// (Z_j + P')/√2 is absorbed into the frame, after which the reference
    /// outcome is the stabiliser Z_j. Returns the sign of P' and the Pauli of
    /// the circuit that leads to the other outcome.
    pub(super) fn collapse(&mut self, pulled: PauliString, column: usize) -> (bool, PauliProduct) {
        let negative = pulled.negative();
        let partner = self.frame.push_forward(column, Pauli::Z);
        let mut generator = PauliString::identity(self.frame.qubits());
        toggle(&mut generator.z, column);
        self.frame.pauli_right(&generator);
        generator.multiply(&pulled.unsigned());
        self.frame.rotate_right(&generator);
        (negative, partner)
    }

    /// Puts a fresh qubit's Z and X on one new active column.
    pub(super) fn place_fresh(&mut self, qubit: u32) -> Result<u16, CompileError> {
        let z_axis: PauliProduct = [(qubit, Pauli::Z)].into_iter().collect();
        let x_axis: PauliProduct = [(qubit, Pauli::X)].into_iter().collect();
        let z_image = self.frame.pull_back(&z_axis);
        if z_image.negative() {
            self.apply(Clifford::X(qubit));
        }
        let x_image = self.frame.pull_back(&x_axis);
        // The two images anticommute and that of Z is Z on inactive columns,
        // so X of one has a part where Z of the other has one.
        let column = ones_and(&x_image.x, &z_image.z)
            .next()
            .expect("the images of X and Z of a fresh qubit anticommute on an inactive column");
        if self.straighten(&x_axis, column) {
            self.apply(Clifford::Z(qubit));
        }
        self.take_slot(column)
    }

    /// Gives an inactive column the lowest free slot.
    fn take_slot(&mut self, column: usize) -> Result<u16, CompileError> {
        let slot = self
            .used_slots
            .iter()
            .position(|used| !used)
            .unwrap_or(self.used_slots.len());
        if slot >= MAX_SLOTS {
            return Err(CompileError::TooManyActive {
                operation: self.operation,
            });
        }
        if slot == self.used_slots.len() {
            self.used_slots.push(true);
        } else {
            self.used_slots[slot] = true;
        }
        self.slots[column] = Some(slot as u16);
        toggle(&mut self.active, column);
        toggle(&mut self.inactive, column);
        self.last_reading[column] = None;
        let count = self.used_slots.iter().filter(|&&used| used).count();
        self.peak_active = self.peak_active.max(count);
        Ok(slot as u16)
    }

    /// Takes a measured column out of the register.
    pub(super) fn drop_slot(&mut self, column: usize) {
        let slot = self.slots[column]
            .take()
            .expect("a measured column is active");
        self.used_slots[usize::from(slot)] = false;
        toggle(&mut self.active, column);
        toggle(&mut self.inactive, column);
    }

    pub(super) fn slot(&self, column: usize) -> u16 {
        self.slots[column].expect("the column is active")
    }
}

/// Indices of the ones of the bitwise and of two masks.
pub(super) fn ones_and(left: &[u64], right: &[u64]) -> impl Iterator<Item = usize> + use<> {
    let both: Vec<u64> = left.iter().zip(right).map(|(a, b)| a & b).collect();
    (0..both.len() * 64).filter(move |&index| bit(&both, index))
}
