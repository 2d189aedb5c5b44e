//! Exact distribution of a noisy circuit's bits, by density matrices.

use std::collections::BTreeMap;

use num_complex::Complex64;

use crate::circuit::{Clifford, Pauli};
use crate::noise::{Kind, NoisyCircuit, PauliChoices};

type Matrix = Vec<Vec<Complex64>>;

const ZERO: Complex64 = Complex64::new(0.0, 0.0);

#[allow(clippy::needless_range_loop)] // rows and columns are permuted
fn pauli_matrix(qubits: usize, letters: &[(u32, Pauli)]) -> Matrix {
    let size = 1 << qubits;
    let mut matrix = vec![vec![ZERO; size]; size];
    for column in 0..size {
        let (mut row, mut value) = (column, Complex64::ONE);
        for &(qubit, letter) in letters {
            let one = column >> qubit & 1 == 1;
            match letter {
                Pauli::I => {}
                Pauli::X => row ^= 1 << qubit,
                Pauli::Z => value *= if one { -1.0 } else { 1.0 },
                Pauli::Y => {
                    row ^= 1 << qubit;
                    value *= if one { -Complex64::I } else { Complex64::I };
                }
            }
        }
        matrix[row][column] = value;
    }
    matrix
}

fn combine(a: Complex64, left: &Matrix, b: Complex64, right: &Matrix) -> Matrix {
    left.iter()
        .zip(right)
        .map(|(l, r)| l.iter().zip(r).map(|(x, y)| a * x + b * y).collect())
        .collect()
}

fn product(left: &Matrix, right: &Matrix) -> Matrix {
    let size = left.len();
    let mut result = vec![vec![ZERO; size]; size];
    for (row, result) in left.iter().zip(&mut result) {
        for (value, inner) in row.iter().zip(right) {
            if *value != ZERO {
                result
                    .iter_mut()
                    .zip(inner)
                    .for_each(|(sum, entry)| *sum += value * entry);
            }
        }
    }
    result
}

fn dagger(matrix: &Matrix) -> Matrix {
    let size = matrix.len();
    (0..size)
        .map(|row| (0..size).map(|column| matrix[column][row].conj()).collect())
        .collect()
}

fn conjugate(matrix: &Matrix, state: &Matrix) -> Matrix {
    product(&product(matrix, state), &dagger(matrix))
}

fn diagonal(size: usize, entry: impl Fn(usize) -> Complex64) -> Matrix {
    let mut matrix = vec![vec![ZERO; size]; size];
    (0..size).for_each(|index| matrix[index][index] = entry(index));
    matrix
}

fn rotation(qubits: usize, axis: &[(u32, Pauli)], angle: f64) -> Matrix {
    let identity = pauli_matrix(qubits, &[]);
    let (cos, sin) = ((angle / 2.0).cos(), (angle / 2.0).sin());
    combine(
        cos.into(),
        &identity,
        -Complex64::I * sin,
        &pauli_matrix(qubits, axis),
    )
}

fn clifford(qubits: usize, gate: &Clifford) -> Matrix {
    let size = 1usize << qubits;
    let has = |index: usize, qubit: u32| index >> qubit & 1 == 1;
    let permutation = |map: &dyn Fn(usize) -> usize| {
        let mut matrix = vec![vec![ZERO; size]; size];
        (0..size).for_each(|column| matrix[map(column)][column] = Complex64::ONE);
        matrix
    };
    match *gate {
        Clifford::X(q) => pauli_matrix(qubits, &[(q, Pauli::X)]),
        Clifford::Y(q) => pauli_matrix(qubits, &[(q, Pauli::Y)]),
        Clifford::Z(q) => pauli_matrix(qubits, &[(q, Pauli::Z)]),
        Clifford::H(q) => {
            let half = Complex64::from(std::f64::consts::FRAC_1_SQRT_2);
            let (x, z) = (
                pauli_matrix(qubits, &[(q, Pauli::X)]),
                pauli_matrix(qubits, &[(q, Pauli::Z)]),
            );
            combine(half, &x, half, &z)
        }
        Clifford::S(q) => diagonal(size, |i| if has(i, q) { Complex64::I } else { 1.0.into() }),
        Clifford::Sdg(q) => diagonal(size, |i| if has(i, q) { -Complex64::I } else { 1.0.into() }),
        Clifford::Cx(c, t) => permutation(&|i| if has(i, c) { i ^ 1 << t } else { i }),
        Clifford::Cz(a, b) => diagonal(size, |i| {
            if has(i, a) && has(i, b) {
                (-1.0).into()
            } else {
                1.0.into()
            }
        }),
        Clifford::Swap(a, b) => permutation(&|i| {
            if has(i, a) != has(i, b) {
                i ^ 1 << a ^ 1 << b
            } else {
                i
            }
        }),
        Clifford::QuarterTurn(ref axis) => rotation(qubits, axis, std::f64::consts::FRAC_PI_2),
    }
}

fn add(into: &mut BTreeMap<u32, Matrix>, bits: u32, state: Matrix, weight: f64) {
    let size = state.len();
    let entry = into
        .entry(bits)
        .or_insert_with(|| vec![vec![ZERO; size]; size]);
    for (row, other) in entry.iter_mut().zip(state) {
        row.iter_mut()
            .zip(other)
            .for_each(|(sum, value)| *sum += value * weight);
    }
}

/// Exact distribution of the classical bits.
pub(super) fn reference(circuit: &NoisyCircuit, qubits: usize) -> BTreeMap<u32, f64> {
    let size = 1usize << qubits;
    let start = diagonal(size, |index| if index == 0 { Complex64::ONE } else { ZERO });
    let mut states = BTreeMap::from([(0, start)]);
    for instruction in &circuit.instructions {
        let mut next = BTreeMap::new();
        for (bits, state) in states {
            if instruction
                .condition
                .is_some_and(|bit| bits >> bit & 1 == 0)
            {
                add(&mut next, bits, state, 1.0);
            } else {
                act(&instruction.kind, qubits, bits, state, &mut next);
            }
        }
        states = next;
    }
    states
        .into_iter()
        .map(|(bits, state)| (bits, (0..size).map(|index| state[index][index].re).sum()))
        .collect()
}

fn act(kind: &Kind, qubits: usize, bits: u32, state: Matrix, next: &mut BTreeMap<u32, Matrix>) {
    let size = 1usize << qubits;
    let projector = |qubit: u32, value: bool| {
        diagonal(size, |index| {
            if (index >> qubit & 1 == 1) == value {
                Complex64::ONE
            } else {
                ZERO
            }
        })
    };
    match kind {
        Kind::Clifford(gate) => add(next, bits, conjugate(&clifford(qubits, gate), &state), 1.0),
        Kind::Rotation { axis, angle } => {
            add(
                next,
                bits,
                conjugate(&rotation(qubits, axis, *angle), &state),
                1.0,
            );
        }
        Kind::Ccz(on) => {
            let mask = on.iter().fold(0, |mask, qubit| mask | 1 << qubit);
            let gate = diagonal(size, |i| {
                if i & mask == mask {
                    (-1.0).into()
                } else {
                    1.0.into()
                }
            });
            add(next, bits, conjugate(&gate, &state), 1.0);
        }
        Kind::Measure { qubit, bit, flip } => {
            for value in [false, true] {
                let after = conjugate(&projector(*qubit, value), &state);
                let Some(bit) = bit else {
                    add(next, bits, after, 1.0);
                    continue;
                };
                let chance = if value {
                    flip.one_to_zero
                } else {
                    flip.zero_to_one
                };
                for (recorded, weight) in [(value, 1.0 - chance), (!value, chance)] {
                    let bits = bits & !(1 << bit) | u32::from(recorded) << bit;
                    add(next, bits, after.clone(), weight);
                }
            }
        }
        Kind::Reset { qubit } => {
            let x = pauli_matrix(qubits, &[(*qubit, Pauli::X)]);
            add(
                next,
                bits,
                conjugate(&projector(*qubit, false), &state),
                1.0,
            );
            add(
                next,
                bits,
                conjugate(&product(&x, &projector(*qubit, true)), &state),
                1.0,
            );
        }
        Kind::Assign { bit, value } => {
            let value = value.evaluate(&|index| bits >> index & 1 == 1);
            add(
                next,
                bits & !(1 << bit) | u32::from(value) << bit,
                state,
                1.0,
            );
        }
        Kind::Pauli(channel) => {
            let PauliChoices::Listed(list) = &channel.choices else {
                unreachable!()
            };
            let total: f64 = list.iter().map(|entry| entry.1).sum();
            for (word, probability) in list {
                let letters: Vec<(u32, Pauli)> = channel
                    .qubits
                    .iter()
                    .enumerate()
                    .map(|(i, &q)| {
                        (
                            q,
                            Pauli::from_parts(word.x >> i & 1 == 1, word.z >> i & 1 == 1),
                        )
                    })
                    .collect();
                add(
                    next,
                    bits,
                    conjugate(&pauli_matrix(qubits, &letters), &state),
                    *probability,
                );
            }
            add(next, bits, state, 1.0 - total);
        }
        Kind::Damping { qubit, gamma } => {
            let keep = diagonal(size, |i| {
                Complex64::from(if i >> qubit & 1 == 1 {
                    (1.0 - gamma).sqrt()
                } else {
                    1.0
                })
            });
            let x = pauli_matrix(qubits, &[(*qubit, Pauli::X)]);
            let decay = product(&x, &projector(*qubit, true));
            add(next, bits, conjugate(&keep, &state), 1.0);
            add(next, bits, conjugate(&decay, &state), *gamma);
        }
    }
}
