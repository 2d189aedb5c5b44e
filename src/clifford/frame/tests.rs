//! The frame against dense unitaries, signs included.

use num_complex::Complex64;
use rand::{Rng, RngExt, SeedableRng};
use rand_pcg::Pcg64;
use smallvec::smallvec;

use super::*;

/// A state or operator column of 2^n amplitudes.
type Vector = Vec<Complex64>;

const QUBITS: usize = 4;

/// i^phase X^x Z^z applied to a vector.
fn apply_string(string: &PauliString, vector: &Vector) -> Vector {
    let (x, z) = (string.x[0] as usize, string.z[0] as usize);
    let mut result = vec![Complex64::ZERO; vector.len()];
    for (index, value) in vector.iter().enumerate() {
        let sign = if (index & z).count_ones() % 2 == 1 {
            -1.0
        } else {
            1.0
        };
        result[index ^ x] = value * sign * Complex64::I.powi(i32::from(string.phase));
    }
    result
}

fn combine(left: &Vector, right: &Vector, factor: Complex64, scale: f64) -> Vector {
    left.iter()
        .zip(right)
        .map(|(a, b)| (a + factor * b) * scale)
        .collect()
}

/// The gate on a vector, written out from its definition.
fn apply_gate(gate: &Clifford, vector: &Vector) -> Vector {
    let string = |letters: &[(u32, Pauli)]| {
        PauliString::from_product(QUBITS, &letters.iter().copied().collect())
    };
    let half = std::f64::consts::FRAC_1_SQRT_2;
    let has = |index: usize, qubit: u32| index >> qubit & 1 == 1;
    let permuted = |map: &dyn Fn(usize) -> usize| {
        let mut result = vec![Complex64::ZERO; vector.len()];
        vector
            .iter()
            .enumerate()
            .for_each(|(index, value)| result[map(index)] = *value);
        result
    };
    let diagonal = |entry: &dyn Fn(usize) -> Complex64| -> Vector {
        vector
            .iter()
            .enumerate()
            .map(|(index, value)| value * entry(index))
            .collect()
    };
    let one = Complex64::ONE;
    match *gate {
        Clifford::X(q) => apply_string(&string(&[(q, Pauli::X)]), vector),
        Clifford::Y(q) => apply_string(&string(&[(q, Pauli::Y)]), vector),
        Clifford::Z(q) => apply_string(&string(&[(q, Pauli::Z)]), vector),
        Clifford::H(q) => combine(
            &apply_string(&string(&[(q, Pauli::X)]), vector),
            &apply_string(&string(&[(q, Pauli::Z)]), vector),
            one,
            half,
        ),
        Clifford::S(q) => diagonal(&|i| if has(i, q) { Complex64::I } else { one }),
        Clifford::Sdg(q) => diagonal(&|i| if has(i, q) { -Complex64::I } else { one }),
        Clifford::Cx(c, t) => permuted(&|i| if has(i, c) { i ^ 1 << t } else { i }),
        Clifford::Cz(a, b) => diagonal(&|i| if has(i, a) && has(i, b) { -one } else { one }),
        Clifford::Swap(a, b) => permuted(&|i| {
            if has(i, a) != has(i, b) {
                i ^ 1 << a ^ 1 << b
            } else {
                i
            }
        }),
        // exp(−iπP/4) = (1 − iP)/√2.
        Clifford::QuarterTurn(ref axis) => {
            let turned = apply_string(&PauliString::from_product(QUBITS, axis), vector);
            combine(vector, &turned, -Complex64::I, half)
        }
    }
}

fn random_axis(rng: &mut impl Rng) -> PauliProduct {
    let letter = |rng: &mut dyn Rng| [Pauli::X, Pauli::Y, Pauli::Z][rng.random_range(0..3)];
    let first = rng.random_range(0..QUBITS as u32);
    let second = (first + rng.random_range(1..QUBITS as u32)) % QUBITS as u32;
    let mut axis: PauliProduct = smallvec![(first, letter(rng))];
    if rng.random() {
        axis.push((second, letter(rng)));
    }
    axis
}

fn random_gate(rng: &mut impl Rng) -> Clifford {
    let a = rng.random_range(0..QUBITS as u32);
    let b = (a + rng.random_range(1..QUBITS as u32)) % QUBITS as u32;
    match rng.random_range(0..10) {
        0 => Clifford::X(a),
        1 => Clifford::Y(a),
        2 => Clifford::Z(a),
        3 => Clifford::H(a),
        4 => Clifford::S(a),
        5 => Clifford::Sdg(a),
        6 => Clifford::Cx(a, b),
        7 => Clifford::Cz(a, b),
        8 => Clifford::Swap(a, b),
        _ => Clifford::QuarterTurn(random_axis(rng)),
    }
}

fn random_string(rng: &mut impl Rng, without: Option<usize>) -> PauliString {
    let mut mask = (1u64 << QUBITS) - 1;
    if let Some(column) = without {
        mask &= !(1 << column);
    }
    let string = PauliString {
        x: vec![rng.random::<u64>() & mask],
        z: vec![rng.random::<u64>() & mask],
        phase: 0,
    };
    string.unsigned()
}

/// C as its columns: C|i⟩ for every i.
struct Dense(Vec<Vector>);

impl Dense {
    fn identity() -> Self {
        let size = 1 << QUBITS;
        let unit = |index: usize| -> Vector {
            (0..size)
                .map(|row| {
                    if row == index {
                        Complex64::ONE
                    } else {
                        Complex64::ZERO
                    }
                })
                .collect()
        };
        Dense((0..size).map(unit).collect())
    }

    fn apply(&self, vector: &Vector) -> Vector {
        let mut result = vec![Complex64::ZERO; vector.len()];
        for (column, value) in self.0.iter().zip(vector) {
            result
                .iter_mut()
                .zip(column)
                .for_each(|(sum, entry)| *sum += entry * value);
        }
        result
    }

    /// C ← G·C.
    fn left(&mut self, gate: &Clifford) {
        self.0
            .iter_mut()
            .for_each(|column| *column = apply_gate(gate, column));
    }

    /// C ← C·G for G given by what it does to a vector.
    fn right(&mut self, gate: impl Fn(&Vector) -> Vector) {
        let columns = Dense::identity()
            .0
            .iter()
            .map(|unit| self.apply(&gate(unit)))
            .collect();
        self.0 = columns;
    }

    /// Checks P·C = C·(C†PC) on every column, sign included.
    fn agrees(&self, frame: &Frame) {
        for qubit in 0..QUBITS as u32 {
            for letter in [Pauli::X, Pauli::Y, Pauli::Z] {
                let axis: PauliProduct = smallvec![(qubit, letter)];
                let pulled = frame.pull_back(&axis);
                let lab = PauliString::from_product(QUBITS, &axis);
                for unit in &Dense::identity().0 {
                    let left = apply_string(&lab, &self.apply(unit));
                    let right = self.apply(&apply_string(&pulled, unit));
                    for (a, b) in left.iter().zip(&right) {
                        assert!((a - b).norm() < 1e-12, "{axis:?}");
                    }
                }
            }
        }
        for column in 0..QUBITS {
            for letter in [Pauli::X, Pauli::Z] {
                let axis: PauliProduct = smallvec![(column as u32, letter)];
                let inner = PauliString::from_product(QUBITS, &axis);
                let pushed = PauliString::from_product(QUBITS, &frame.push_forward(column, letter));
                let unit = &Dense::identity().0[5];
                let left = self.apply(&apply_string(&inner, unit));
                let right = apply_string(&pushed, &self.apply(unit));
                // Equal up to the sign that push_forward leaves out.
                let same = left.iter().zip(&right).all(|(a, b)| (a - b).norm() < 1e-12);
                let opposite = left.iter().zip(&right).all(|(a, b)| (a + b).norm() < 1e-12);
                assert!(same || opposite);
            }
        }
    }
}

#[test]
fn gates_and_changes_of_basis_match_dense_unitaries() {
    let mut rng = Pcg64::seed_from_u64(11);
    let half = std::f64::consts::FRAC_1_SQRT_2;
    for _ in 0..60 {
        let (mut frame, mut dense) = (Frame::identity(QUBITS), Dense::identity());
        for _ in 0..40 {
            let column = rng.random_range(0..QUBITS);
            match rng.random_range(0..12) {
                0 => {
                    frame.hadamard_right(column);
                    dense.right(|v| apply_gate(&Clifford::H(column as u32), v));
                }
                1 => {
                    frame.phase_right(column);
                    dense.right(|v| apply_gate(&Clifford::S(column as u32), v));
                }
                2 => {
                    let target = (column + 1) % QUBITS;
                    frame.controlled_not_right(column, target);
                    let gate = Clifford::Cx(column as u32, target as u32);
                    dense.right(|v| apply_gate(&gate, v));
                }
                3 => {
                    let string = random_string(&mut rng, None);
                    frame.pauli_right(&string);
                    dense.right(|v| apply_string(&string, v));
                }
                4 => {
                    let mut generator = random_string(&mut rng, None);
                    // K² = −1: i times a Hermitian string.
                    generator.phase = (generator.phase + 1) & 3;
                    frame.rotate_right(&generator);
                    dense.right(|v| combine(v, &apply_string(&generator, v), Complex64::ONE, half));
                }
                5 => {
                    let target = random_string(&mut rng, Some(column));
                    frame.controlled_right(column, &target);
                    dense.right(|v| {
                        let acted = apply_string(&target, v);
                        let pick = |i: usize| if i >> column & 1 == 1 { acted[i] } else { v[i] };
                        (0..v.len()).map(pick).collect()
                    });
                }
                _ => {
                    let gate = random_gate(&mut rng);
                    frame.apply(&gate);
                    dense.left(&gate);
                }
            }
        }
        dense.agrees(&frame);
        let signed = frame.clone();
        let carried = frame.take_signs();
        for (qubit, (x, z)) in carried.into_iter().enumerate() {
            // The old frame is F times the new one.
            if x {
                frame.apply(&Clifford::X(qubit as u32));
            }
            if z {
                frame.apply(&Clifford::Z(qubit as u32));
            }
        }
        assert_eq!(frame, signed);
    }
}
