//! The shared Clifford frame C as an inverse tableau.
//!
//! Row X_q (Z_q) holds the image C†X_qC (C†Z_qC), so pulling a Pauli of the
//! circuit back to the register is a product of few rows (Phys. Rev. A 70,
//! 052328 (2004)). Circuit gates multiply C from the left and touch the rows of
//! their qubits only; changes of the register's basis multiply C from the right
//! and touch columns of all rows.

use crate::circuit::{Clifford, Pauli, PauliProduct};

use super::pauli::{PauliString, bit, overlap, words_for};

/// A Pauli string as the words that are not 0: (index, X parts, Z parts). A
/// string on few qubits then touches few words of every row.
struct Packed {
    words: Vec<(usize, u64, u64)>,
    phase: u8,
}

impl From<&PauliString> for Packed {
    fn from(string: &PauliString) -> Self {
        let words = string.x.iter().zip(&string.z).enumerate();
        Packed {
            words: words
                .filter(|(_, (x, z))| **x | **z != 0)
                .map(|(word, (x, z))| (word, *x, *z))
                .collect(),
            phase: string.phase,
        }
    }
}

/// A Clifford operator, up to a global phase.
#[derive(Debug, Clone, PartialEq, Eq, Hash)]
pub struct Frame {
    qubits: usize,
    words: usize,
    /// Row 2q is the image of X_q, row 2q + 1 that of Z_q; `words` words of X
    /// parts, then as many of Z parts.
    rows: Vec<u64>,
    /// Power of i of each row.
    phases: Vec<u8>,
}

impl Frame {
    /// The identity on `qubits` qubits.
    pub fn identity(qubits: usize) -> Self {
        let words = words_for(qubits);
        let mut frame = Frame {
            qubits,
            words,
            rows: vec![0; 4 * qubits * words],
            phases: vec![0; 2 * qubits],
        };
        for qubit in 0..qubits {
            let (word, mask) = (qubit / 64, 1 << (qubit % 64));
            frame.row_mut(2 * qubit)[word] = mask;
            frame.row_mut(2 * qubit + 1)[words + word] = mask;
        }
        frame
    }

    /// Bytes the tableau takes.
    pub fn bytes(&self) -> usize {
        8 * self.rows.len() + self.phases.len()
    }

    /// Number of qubits.
    pub fn qubits(&self) -> usize {
        self.qubits
    }

    fn row(&self, index: usize) -> &[u64] {
        &self.rows[2 * index * self.words..2 * (index + 1) * self.words]
    }

    fn row_mut(&mut self, index: usize) -> &mut [u64] {
        &mut self.rows[2 * index * self.words..2 * (index + 1) * self.words]
    }

    /// Row `target` ← i^phase · row `target` · row `source`.
    fn multiply_rows(&mut self, target: usize, source: usize, phase: u8) {
        let stride = 2 * self.words;
        let (low, high) = (target.min(source), target.max(source));
        let (head, tail) = self.rows.split_at_mut(high * stride);
        let (low_row, high_row) = (
            &mut head[low * stride..(low + 1) * stride],
            &mut tail[..stride],
        );
        let (to, from) = if target < source {
            (low_row, high_row)
        } else {
            (high_row, low_row)
        };
        let swapped = overlap(&to[self.words..], &from[..self.words]);
        to.iter_mut().zip(from.iter()).for_each(|(a, b)| *a ^= b);
        let sum = u32::from(self.phases[target] + self.phases[source] + phase) + 2 * swapped;
        self.phases[target] = (sum & 3) as u8;
    }

    fn swap_rows(&mut self, left: usize, right: usize) {
        if left == right {
            return;
        }
        let stride = 2 * self.words;
        let (low, high) = (left.min(right), left.max(right));
        let (head, tail) = self.rows.split_at_mut(high * stride);
        head[low * stride..(low + 1) * stride].swap_with_slice(&mut tail[..stride]);
        self.phases.swap(left, right);
    }

    /// C†PC for a product of letters with sign +.
    pub fn pull_back(&self, product: &PauliProduct) -> PauliString {
        let mut image = PauliString::identity(self.qubits);
        for &(qubit, letter) in product {
            let qubit = qubit as usize;
            if letter.x() {
                self.multiply_into(&mut image, 2 * qubit);
            }
            if letter.z() {
                self.multiply_into(&mut image, 2 * qubit + 1);
            }
            if letter == Pauli::Y {
                image.phase = (image.phase + 1) & 3;
            }
        }
        image
    }

    fn multiply_into(&self, image: &mut PauliString, index: usize) {
        let (x, z) = self.row(index).split_at(self.words);
        let swapped = overlap(&image.z, x);
        image.phase = ((u32::from(image.phase + self.phases[index]) + 2 * swapped) & 3) as u8;
        image.x.iter_mut().zip(x).for_each(|(a, b)| *a ^= b);
        image.z.iter_mut().zip(z).for_each(|(a, b)| *a ^= b);
    }

    /// C·P·C† for P = X_column (or Z_column), without its sign.
    ///
    /// It has an X part on qubit q where it anticommutes with Z_q, that is
    /// where P anticommutes with C†Z_qC.
    pub fn push_forward(&self, column: usize, letter: Pauli) -> PauliProduct {
        let offset = match letter {
            Pauli::X => self.words,
            Pauli::Z => 0,
            _ => unreachable!("only X and Z of a column are pushed forward"),
        };
        let anticommutes = |row: usize| bit(&self.row(row)[offset..], column);
        (0..self.qubits)
            .map(|qubit| (qubit, anticommutes(2 * qubit + 1), anticommutes(2 * qubit)))
            .filter(|&(_, x, z)| x || z)
            .map(|(qubit, x, z)| (qubit as u32, Pauli::from_parts(x, z)))
            .collect()
    }

    /// C ← G·C.
    pub fn apply(&mut self, gate: &Clifford) {
        let x = |qubit: u32| 2 * qubit as usize;
        let z = |qubit: u32| 2 * qubit as usize + 1;
        match *gate {
            Clifford::X(q) => self.negate(z(q)),
            Clifford::Z(q) => self.negate(x(q)),
            Clifford::Y(q) => {
                self.negate(x(q));
                self.negate(z(q));
            }
            Clifford::H(q) => self.swap_rows(x(q), z(q)),
            // S†XS = −Y = −i·XZ, S X S† = Y = i·XZ.
            Clifford::S(q) => self.multiply_rows(x(q), z(q), 3),
            Clifford::Sdg(q) => self.multiply_rows(x(q), z(q), 1),
            Clifford::Cx(control, target) => {
                self.multiply_rows(x(control), x(target), 0);
                self.multiply_rows(z(target), z(control), 0);
            }
            Clifford::Cz(a, b) => {
                self.multiply_rows(x(a), z(b), 0);
                self.multiply_rows(x(b), z(a), 0);
            }
            Clifford::Swap(a, b) => {
                self.swap_rows(x(a), x(b));
                self.swap_rows(z(a), z(b));
            }
            Clifford::QuarterTurn(ref axis) => self.quarter_turn(axis),
        }
    }

    /// C ← exp(−iπP/4)·C: a generator R that anticommutes with P becomes iPR.
    fn quarter_turn(&mut self, axis: &PauliProduct) {
        let pulled = Packed::from(&self.pull_back(axis));
        for &(qubit, letter) in axis {
            let rows = [
                (2 * qubit as usize, letter.z()),
                (2 * qubit as usize + 1, letter.x()),
            ];
            for (row, anticommutes) in rows {
                if anticommutes {
                    // i·P·R = −i·R·P because the two anticommute.
                    self.multiply_row(row, &pulled, 3);
                }
            }
        }
    }

    fn negate(&mut self, row: usize) {
        self.phases[row] ^= 2;
    }

    /// Row ← i^phase · row · string.
    fn multiply_row(&mut self, row: usize, string: &Packed, phase: u8) {
        let words = self.words;
        let (x, z) = self.row_mut(row).split_at_mut(words);
        let mut swapped = 0;
        for &(word, string_x, string_z) in &string.words {
            swapped += (z[word] & string_x).count_ones();
            x[word] ^= string_x;
            z[word] ^= string_z;
        }
        let sum = u32::from(self.phases[row] + string.phase + phase) + 2 * swapped;
        self.phases[row] = (sum & 3) as u8;
    }

    fn row_anticommutes(&self, row: usize, string: &Packed) -> bool {
        let (x, z) = self.row(row).split_at(self.words);
        let parity = string
            .words
            .iter()
            .fold(0, |parity, &(word, string_x, string_z)| {
                parity ^ (x[word] & string_z) ^ (z[word] & string_x)
            });
        parity.count_ones() & 1 == 1
    }

    /// C ← C·(1 + K)/√2 for a string K with K² = −1: a row R that anticommutes
    /// with K becomes R·K.
    pub fn rotate_right(&mut self, generator: &PauliString) {
        let generator = Packed::from(generator);
        for row in 0..2 * self.qubits {
            if self.row_anticommutes(row, &generator) {
                self.multiply_row(row, &generator, 0);
            }
        }
    }

    /// C ← C·P for a Pauli string P.
    pub fn pauli_right(&mut self, string: &PauliString) {
        let string = Packed::from(string);
        for row in 0..2 * self.qubits {
            if self.row_anticommutes(row, &string) {
                self.negate(row);
            }
        }
    }

    /// C ← C·W with W = |0⟩⟨0|_column ⊗ 1 + |1⟩⟨1|_column ⊗ Q, the controlled
    /// Pauli string Q; Q is Hermitian and the identity on the column. W leaves
    /// |0⟩ of the column alone.
    ///
    /// W R W: a row that anticommutes with Z of the column takes a factor Q from
    /// the right, one that anticommutes with Q a factor Z, one with both −Z·Q.
    pub fn controlled_right(&mut self, column: usize, target: &PauliString) {
        let control = Packed {
            words: vec![(column / 64, 0, 1 << (column % 64))],
            phase: 0,
        };
        let target = Packed::from(target);
        for row in 0..2 * self.qubits {
            let with_control = bit(self.row(row), column);
            let with_target = self.row_anticommutes(row, &target);
            match (with_control, with_target) {
                (false, false) => {}
                (true, false) => self.multiply_row(row, &target, 0),
                (false, true) => self.multiply_row(row, &control, 0),
                (true, true) => {
                    self.multiply_row(row, &control, 2);
                    self.multiply_row(row, &target, 0);
                }
            }
        }
    }

    /// C ← C·H on a column.
    pub fn hadamard_right(&mut self, column: usize) {
        let (word, shift, words) = (column / 64, column % 64, self.words);
        for row in 0..2 * self.qubits {
            let bits = self.row_mut(row);
            let (x, z) = (bits[word] >> shift & 1, bits[words + word] >> shift & 1);
            let change = (x ^ z) << shift;
            bits[word] ^= change;
            bits[words + word] ^= change;
            // XZ becomes ZX = −XZ.
            self.phases[row] ^= ((x & z) as u8) << 1;
        }
    }

    /// C ← C·S on a column: X becomes −Y = −i·XZ, hence Y becomes X.
    pub fn phase_right(&mut self, column: usize) {
        let (word, shift, words) = (column / 64, column % 64, self.words);
        for row in 0..2 * self.qubits {
            let bits = self.row_mut(row);
            let x = bits[word] >> shift & 1;
            bits[words + word] ^= x << shift;
            self.phases[row] = (self.phases[row] + 3 * x as u8) & 3;
        }
    }

    /// C ← C·CNOT between two columns.
    pub fn controlled_not_right(&mut self, control: usize, target: usize) {
        let words = self.words;
        for row in 0..2 * self.qubits {
            let bits = self.row_mut(row);
            let x = bits[control / 64] >> (control % 64) & 1;
            let z = bits[words + target / 64] >> (target % 64) & 1;
            bits[target / 64] ^= x << (target % 64);
            bits[words + control / 64] ^= z << (control % 64);
        }
    }

    /// Makes every sign + and returns the Pauli F of the circuit, by qubit as
    /// (X part, Z part), for which the old frame is F times the new one, up to
    /// a phase.
    pub fn take_signs(&mut self) -> Vec<(bool, bool)> {
        let mut negative = |row: usize| {
            let (x, z) =
                self.rows[2 * row * self.words..2 * (row + 1) * self.words].split_at(self.words);
            let plain = (overlap(x, z) & 3) as u8;
            std::mem::replace(&mut self.phases[row], plain) != plain
        };
        (0..self.qubits)
            .map(|qubit| {
                let (x_row, z_row) = (negative(2 * qubit), negative(2 * qubit + 1));
                (z_row, x_row)
            })
            .collect()
    }
}

#[cfg(test)]
mod tests;
