//! Clifford gates under a condition: what the register does for them.

use smallvec::smallvec;

use crate::circuit::{Clifford, Pauli, PauliProduct};

/// A Clifford gate as quarter turns and a Pauli, up to a global phase:
/// S = turn(Z), H = X·turn(Y), CX = turn(Z)·turn(X)·turn(ZX)⁻¹ and so on;
/// turn(P)⁻¹ = P·turn(P).
pub(super) fn quarter_turns_of(gate: &Clifford) -> (Vec<PauliProduct>, PauliProduct) {
    let one = |qubit, letter| -> PauliProduct { smallvec![(qubit, letter)] };
    let two = |a, first, b, second| -> PauliProduct { smallvec![(a, first), (b, second)] };
    match *gate {
        Clifford::X(q) => (vec![], one(q, Pauli::X)),
        Clifford::Y(q) => (vec![], one(q, Pauli::Y)),
        Clifford::Z(q) => (vec![], one(q, Pauli::Z)),
        Clifford::H(q) => (vec![one(q, Pauli::Y)], one(q, Pauli::X)),
        Clifford::S(q) => (vec![one(q, Pauli::Z)], smallvec![]),
        Clifford::Sdg(q) => (vec![one(q, Pauli::Z)], one(q, Pauli::Z)),
        Clifford::Cx(control, target) => {
            let both = two(control, Pauli::Z, target, Pauli::X);
            let turns = vec![one(control, Pauli::Z), one(target, Pauli::X), both.clone()];
            (turns, both)
        }
        Clifford::Cz(a, b) => {
            let both = two(a, Pauli::Z, b, Pauli::Z);
            (vec![one(a, Pauli::Z), one(b, Pauli::Z), both.clone()], both)
        }
        Clifford::Swap(a, b) => {
            let turns = [Pauli::X, Pauli::Y, Pauli::Z]
                .into_iter()
                .map(|letter| two(a, letter, b, letter))
                .collect();
            (turns, smallvec![])
        }
        Clifford::QuarterTurn(ref axis) => (vec![axis.clone()], smallvec![]),
    }
}

#[cfg(test)]
mod tests {
    use num_complex::Complex64;

    use super::*;
    use crate::clifford::pauli::PauliString;

    const QUBITS: usize = 2;

    type Vector = Vec<Complex64>;

    fn apply(product: &PauliProduct, vector: &Vector) -> Vector {
        let string = PauliString::from_product(QUBITS, product);
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

    fn turn(axis: &PauliProduct, vector: &Vector) -> Vector {
        let acted = apply(axis, vector);
        let half = std::f64::consts::FRAC_1_SQRT_2;
        let pairs = vector.iter().zip(&acted);
        pairs.map(|(a, b)| (a - Complex64::I * b) * half).collect()
    }

    /// The textbook matrices, column by column, up to one phase.
    #[test]
    fn turns_and_a_pauli_make_the_gate() {
        let (one, i) = (Complex64::ONE, Complex64::I);
        let half = Complex64::new(std::f64::consts::FRAC_1_SQRT_2, 0.0);
        // What the gate does to |index⟩: amplitudes by index, qubit 0 is bit 0.
        type Column = fn(usize, Complex64, Complex64, Complex64) -> Vec<(usize, Complex64)>;
        let cases: [(Clifford, Column); 6] = [
            (Clifford::H(0), |x, _, half, _| {
                let sign = if x & 1 == 1 { -half } else { half };
                vec![(x & 2, half), (x | 1, sign)]
            }),
            (Clifford::S(0), |x, one, _, i| {
                vec![(x, if x & 1 == 1 { i } else { one })]
            }),
            (Clifford::Sdg(0), |x, one, _, i| {
                vec![(x, if x & 1 == 1 { -i } else { one })]
            }),
            (Clifford::Cx(0, 1), |x, one, _, _| {
                vec![(x ^ ((x & 1) << 1), one)]
            }),
            (Clifford::Cz(0, 1), |x, one, _, _| {
                vec![(x, if x == 3 { -one } else { one })]
            }),
            (Clifford::Swap(0, 1), |x, one, _, _| {
                vec![((x >> 1) | ((x & 1) << 1), one)]
            }),
        ];
        for (gate, column) in cases {
            let (turns, pauli) = quarter_turns_of(&gate);
            let mut phase = None;
            for index in 0..4 {
                let mut vector = vec![Complex64::ZERO; 4];
                vector[index] = one;
                for axis in &turns {
                    vector = turn(axis, &vector);
                }
                vector = apply(&pauli, &vector);
                let mut expected = [Complex64::ZERO; 4];
                for (row, value) in column(index, one, half, i) {
                    expected[row] += value;
                }
                let inner: Complex64 = expected
                    .iter()
                    .zip(&vector)
                    .map(|(a, b)| a.conj() * b)
                    .sum();
                let phase = *phase.get_or_insert(inner);
                assert!((phase.norm() - 1.0).abs() < 1e-12, "{gate:?}");
                for (a, b) in expected.iter().zip(&vector) {
                    assert!((a * phase - b).norm() < 1e-12, "{gate:?} on {index}");
                }
            }
        }
    }
}
