//! Textbook matrices of the gates and of elementary gates, for tests. Matrices are
//! those of the OpenQASM 3 standard library (arXiv:2104.14722); for names it lacks (`cu1`, `cu3`,
//! `sxdg`, `iswap`, `ccz`, `rxx`, `ryy`, `rzz`) the usual ones, common practice,
//! no source. Position 0 of a call is the most significant bit of an index.

use std::f64::consts::{FRAC_PI_2, PI};

use num_complex::Complex64;

use super::Gate;
use crate::circuit::elementary::{Clifford, Elementary, Pauli};

pub type Matrix = Vec<Vec<Complex64>>;

pub fn real(value: f64) -> Complex64 {
    Complex64::new(value, 0.0)
}

pub fn phase(angle: f64) -> Complex64 {
    Complex64::from_polar(1.0, angle)
}

pub fn identity(size: usize) -> Matrix {
    let entry = |row, column| real(if row == column { 1.0 } else { 0.0 });
    (0..size)
        .map(|row| (0..size).map(|column| entry(row, column)).collect())
        .collect()
}

pub fn product(left: &Matrix, right: &Matrix) -> Matrix {
    let size = left.len();
    let entry =
        |row: usize, column: usize| (0..size).map(|k| left[row][k] * right[k][column]).sum();
    (0..size)
        .map(|row| (0..size).map(|column| entry(row, column)).collect())
        .collect()
}

pub fn kronecker(left: &Matrix, right: &Matrix) -> Matrix {
    let size = right.len();
    let total = left.len() * size;
    let entry = |row: usize, column: usize| {
        left[row / size][column / size] * right[row % size][column % size]
    };
    (0..total)
        .map(|row| (0..total).map(|column| entry(row, column)).collect())
        .collect()
}

pub fn scaled(factor: Complex64, matrix: &Matrix) -> Matrix {
    matrix
        .iter()
        .map(|row| row.iter().map(|entry| factor * entry).collect())
        .collect()
}

pub fn sum(left: &Matrix, right: &Matrix) -> Matrix {
    left.iter()
        .zip(right)
        .map(|(a, b)| a.iter().zip(b).map(|(x, y)| x + y).collect())
        .collect()
}

pub fn adjoint(matrix: &Matrix) -> Matrix {
    let size = matrix.len();
    (0..size)
        .map(|row| (0..size).map(|column| matrix[column][row].conj()).collect())
        .collect()
}

pub fn diagonal(entries: &[Complex64]) -> Matrix {
    let mut matrix = identity(entries.len());
    for (index, &entry) in entries.iter().enumerate() {
        matrix[index][index] = entry;
    }
    matrix
}

/// `matrix` when every control (in front) has its value, identity otherwise.
pub fn controlled(controls: &[bool], matrix: &Matrix) -> Matrix {
    let inner = matrix.len();
    let mut result = identity(inner << controls.len());
    let block = controls
        .iter()
        .fold(0, |index, &value| index << 1 | usize::from(value));
    for row in 0..inner {
        for column in 0..inner {
            result[block * inner + row][block * inner + column] = matrix[row][column];
        }
    }
    result
}

pub fn same_up_to_phase(left: &Matrix, right: &Matrix) -> bool {
    let overlap: Complex64 = left
        .iter()
        .flatten()
        .zip(right.iter().flatten())
        .map(|(x, y)| x.conj() * y)
        .sum();
    (overlap.norm() - left.len() as f64).abs() < 1e-12
}

pub fn close(left: &Matrix, right: &Matrix) -> bool {
    left.iter()
        .flatten()
        .zip(right.iter().flatten())
        .all(|(x, y)| (x - y).norm() < 1e-12)
}

pub fn pauli(letter: Pauli) -> Matrix {
    let i = Complex64::i();
    match letter {
        Pauli::I => identity(2),
        Pauli::X => vec![vec![real(0.0), real(1.0)], vec![real(1.0), real(0.0)]],
        Pauli::Y => vec![vec![real(0.0), -i], vec![i, real(0.0)]],
        Pauli::Z => diagonal(&[real(1.0), real(-1.0)]),
    }
}

pub fn pauli_product(axis: &[(u8, Pauli)], qubits: usize) -> Matrix {
    (0..qubits).fold(identity(1), |matrix, qubit| {
        let letter = axis.iter().find(|entry| usize::from(entry.0) == qubit);
        kronecker(&matrix, &pauli(letter.map_or(Pauli::I, |entry| entry.1)))
    })
}

/// exp(−i·angle·P/2)
pub fn turn(axis: &[(u8, Pauli)], angle: f64, qubits: usize) -> Matrix {
    let (sine, cosine) = (angle / 2.0).sin_cos();
    sum(
        &scaled(real(cosine), &identity(1 << qubits)),
        &scaled(Complex64::new(0.0, -sine), &pauli_product(axis, qubits)),
    )
}

pub fn hadamard() -> Matrix {
    let half = real(0.5f64.sqrt());
    vec![vec![half, half], vec![half, -half]]
}

pub fn swap() -> Matrix {
    let mut matrix = identity(4);
    matrix.swap(1, 2);
    matrix
}

/// The matrix of a permutation of basis states.
pub fn permutation(qubits: usize, map: impl Fn(usize) -> usize) -> Matrix {
    let size = 1 << qubits;
    let mut matrix = vec![vec![real(0.0); size]; size];
    for column in 0..size {
        matrix[map(column)][column] = real(1.0);
    }
    matrix
}

pub fn elementary_matrix(elementary: &Elementary<u8>, qubits: usize) -> Matrix {
    let bit = |index: usize, qubit: u8| index >> (qubits - 1 - usize::from(qubit)) & 1;
    let flag = |qubit: u8| 1 << (qubits - 1 - usize::from(qubit));
    let on_one = |qubit: u8, matrix: Matrix| {
        let rest = identity(2);
        (0..qubits).fold(identity(1), |whole, position| {
            let here = position == usize::from(qubit);
            kronecker(&whole, if here { &matrix } else { &rest })
        })
    };
    match elementary {
        Elementary::Rotation { axis, angle } => turn(axis, *angle, qubits),
        Elementary::Ccz(three) => {
            let all = |index| three.iter().all(|&qubit| bit(index, qubit) == 1);
            let entries = (0..1 << qubits).map(|index| real(if all(index) { -1.0 } else { 1.0 }));
            diagonal(&entries.collect::<Vec<_>>())
        }
        Elementary::Clifford(gate) => match gate {
            Clifford::X(a) => on_one(*a, pauli(Pauli::X)),
            Clifford::Y(a) => on_one(*a, pauli(Pauli::Y)),
            Clifford::Z(a) => on_one(*a, pauli(Pauli::Z)),
            Clifford::H(a) => on_one(*a, hadamard()),
            Clifford::S(a) => on_one(*a, diagonal(&[real(1.0), Complex64::i()])),
            Clifford::Sdg(a) => on_one(*a, diagonal(&[real(1.0), -Complex64::i()])),
            Clifford::Cx(a, b) => permutation(qubits, |index| {
                if bit(index, *a) == 1 {
                    index ^ flag(*b)
                } else {
                    index
                }
            }),
            Clifford::Cz(a, b) => {
                let sign = |index| bit(index, *a) & bit(index, *b);
                let entries = (0..1 << qubits).map(|index| real(1.0 - 2.0 * sign(index) as f64));
                diagonal(&entries.collect::<Vec<_>>())
            }
            Clifford::Swap(a, b) => permutation(qubits, |index| {
                if bit(index, *a) != bit(index, *b) {
                    index ^ flag(*a) ^ flag(*b)
                } else {
                    index
                }
            }),
            Clifford::QuarterTurn(axis) => turn(axis, FRAC_PI_2, qubits),
        },
    }
}

/// The built-in gate of OpenQASM 3, with its phase e^{iθ/2}.
pub fn builtin_u(theta: f64, phi: f64, lambda: f64) -> Matrix {
    let one = real(1.0);
    let i = Complex64::i();
    let turned = phase(theta);
    scaled(
        real(0.5),
        &vec![
            vec![one + turned, -i * phase(lambda) * (one - turned)],
            vec![
                i * phase(phi) * (one - turned),
                phase(phi + lambda) * (one + turned),
            ],
        ],
    )
}

/// The matrix of a gate with the phase the standard library gives it.
pub fn textbook(gate: Gate, a: &[f64]) -> Matrix {
    let x = || pauli(Pauli::X);
    let z = || pauli(Pauli::Z);
    let p = |angle: f64| diagonal(&[real(1.0), phase(angle)]);
    let one = |letter, angle| turn(&[(0, letter)], angle, 1);
    let two = |letter, angle| turn(&[(0, letter), (1, letter)], angle, 2);
    let sx = || {
        let plus = Complex64::new(0.5, 0.5);
        vec![vec![plus, plus.conj()], vec![plus.conj(), plus]]
    };
    // cu(θ, φ, λ, γ) c, t { p(γ − θ/2) c; ctrl @ U(θ, φ, λ) c, t; }
    let cu = |theta: f64, phi, lambda, gamma: f64| {
        product(
            &controlled(&[true], &builtin_u(theta, phi, lambda)),
            &kronecker(&p(gamma - theta / 2.0), &identity(2)),
        )
    };
    match gate {
        Gate::U => builtin_u(a[0], a[1], a[2]),
        Gate::GlobalPhase => vec![vec![phase(a[0])]],
        Gate::P | Gate::Phase | Gate::U1 => builtin_u(0.0, 0.0, a[0]),
        Gate::U2 => scaled(
            phase(-(a[0] + a[1] + FRAC_PI_2) / 2.0),
            &builtin_u(FRAC_PI_2, a[0], a[1]),
        ),
        Gate::U3 => scaled(
            phase(-(a[0] + a[1] + a[2]) / 2.0),
            &builtin_u(a[0], a[1], a[2]),
        ),
        Gate::Id => identity(2),
        Gate::X => x(),
        Gate::Y => pauli(Pauli::Y),
        Gate::Z => z(),
        Gate::H => hadamard(),
        Gate::S => p(PI / 2.0),
        Gate::Sdg => p(-PI / 2.0),
        Gate::T => p(PI / 4.0),
        Gate::Tdg => p(-PI / 4.0),
        Gate::Sx => sx(),
        Gate::Sxdg => adjoint(&sx()),
        Gate::Rx => one(Pauli::X, a[0]),
        Gate::Ry => one(Pauli::Y, a[0]),
        Gate::Rz => one(Pauli::Z, a[0]),
        Gate::Cx | Gate::UpperCx => controlled(&[true], &x()),
        Gate::Cy => controlled(&[true], &pauli(Pauli::Y)),
        Gate::Cz => controlled(&[true], &z()),
        Gate::Ch => controlled(&[true], &hadamard()),
        Gate::Cp | Gate::Cphase | Gate::Cu1 => controlled(&[true], &p(a[0])),
        Gate::Crx => controlled(&[true], &one(Pauli::X, a[0])),
        Gate::Cry => controlled(&[true], &one(Pauli::Y, a[0])),
        Gate::Crz => controlled(&[true], &one(Pauli::Z, a[0])),
        Gate::Cu => cu(a[0], a[1], a[2], a[3]),
        Gate::Cu3 => cu(a[0], a[1], a[2], 0.0),
        Gate::Swap => swap(),
        Gate::Iswap => product(
            &diagonal(&[real(1.0), Complex64::i(), Complex64::i(), real(1.0)]),
            &swap(),
        ),
        Gate::IswapInverse => adjoint(&textbook(Gate::Iswap, a)),
        Gate::Rxx => two(Pauli::X, a[0]),
        Gate::Ryy => two(Pauli::Y, a[0]),
        Gate::Rzz => two(Pauli::Z, a[0]),
        Gate::Ccx => controlled(&[true, true], &x()),
        Gate::Ccz => controlled(&[true, true], &z()),
        Gate::Cswap => controlled(&[true], &swap()),
        Gate::Negated { .. } => unreachable!("built by the tests themselves"),
    }
}
