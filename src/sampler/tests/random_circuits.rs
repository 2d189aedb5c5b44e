//! Random adaptive noisy circuits.

use std::sync::Arc;

use rand::RngExt;
use rand_pcg::Pcg64;
use smallvec::smallvec;

use crate::circuit::{BitExpression, Clifford, Pauli, PauliProduct, Qubits};
use crate::noise::{
    Instruction, Kind, NoisyCircuit, PauliChannel, PauliChoices, PauliWord, ReadoutFlip,
};

/// What a random circuit may hold.
#[derive(Clone, Copy)]
pub(super) struct Menu {
    pub damping: bool,
    pub generic_angles: bool,
    /// Measurement, reset and damping under a condition.
    pub branches: bool,
    pub instructions: usize,
    pub magic: usize,
}

fn random_axis(rng: &mut Pcg64, qubits: u32) -> PauliProduct {
    let letter = |rng: &mut Pcg64| [Pauli::X, Pauli::Y, Pauli::Z][rng.random_range(0..3)];
    let first = rng.random_range(0..qubits);
    let mut axis: PauliProduct = smallvec![(first, letter(rng))];
    if qubits > 1 && rng.random_bool(0.4) {
        let second = (first + rng.random_range(1..qubits)) % qubits;
        axis.push((second, letter(rng)));
    }
    axis
}

pub(super) fn random_clifford(rng: &mut Pcg64, qubits: u32) -> Clifford {
    let a = rng.random_range(0..qubits);
    let b = (a + rng.random_range(1..qubits)) % qubits;
    match rng.random_range(0..14) {
        0 => Clifford::X(a),
        1 => Clifford::Y(a),
        2 => Clifford::Z(a),
        3..=5 => Clifford::H(a),
        6 => Clifford::S(a),
        7 => Clifford::Sdg(a),
        8..=10 => Clifford::Cx(a, b),
        11 => Clifford::Cz(a, b),
        12 => Clifford::Swap(a, b),
        _ => Clifford::QuarterTurn(random_axis(rng, qubits)),
    }
}

fn random_channel(rng: &mut Pcg64, qubits: u32) -> PauliChannel {
    let a = rng.random_range(0..qubits);
    let mut on = Qubits::from_slice(&[a]);
    if rng.random_bool(0.5) {
        on.push((a + rng.random_range(1..qubits)) % qubits);
    }
    let words = 1u32 << (2 * on.len());
    let mut list = Vec::new();
    for code in 1..words {
        if rng.random_bool(0.5) {
            let mask = (1 << on.len()) - 1;
            let word = PauliWord {
                x: code & mask,
                z: code >> on.len(),
            };
            list.push((word, rng.random::<f64>() * 0.3 / f64::from(words)));
        }
    }
    PauliChannel {
        qubits: on,
        choices: PauliChoices::Listed(list),
    }
}

/// A random circuit that ends with a measurement of every qubit. Bits are the
/// qubits' own and two more.
pub(super) fn random_circuit(rng: &mut Pcg64, qubits: u32, menu: Menu) -> NoisyCircuit {
    let bits = qubits + 2;
    let mut instructions = Vec::new();
    let mut magic = menu.magic;
    for operation in 0..menu.instructions as u32 {
        let qubit = rng.random_range(0..qubits);
        let kind = match rng.random_range(0..20) {
            0..=7 => Kind::Clifford(random_clifford(rng, qubits)),
            8..=10 if magic > 0 => {
                magic -= 1;
                let angle = match rng.random_range(0..4) {
                    0 if menu.generic_angles => rng.random::<f64>() * 6.0 - 3.0,
                    turns => std::f64::consts::FRAC_PI_4 * f64::from(2 * turns + 1),
                };
                Kind::Rotation {
                    axis: random_axis(rng, qubits),
                    angle,
                }
            }
            11 if magic > 1 && qubits >= 3 => {
                magic -= 2;
                Kind::Ccz([qubit, (qubit + 1) % qubits, (qubit + 2) % qubits])
            }
            12..=13 => {
                let small = |rng: &mut Pcg64| rng.random::<f64>() * 0.2;
                let flip = ReadoutFlip {
                    zero_to_one: small(rng),
                    one_to_zero: small(rng),
                };
                let bit = rng.random_bool(0.9).then(|| rng.random_range(0..bits));
                Kind::Measure { qubit, bit, flip }
            }
            14 => Kind::Reset { qubit },
            15 => {
                let bit = |rng: &mut Pcg64| BitExpression::Bit(rng.random_range(0..bits));
                let parts = vec![bit(rng), BitExpression::Not(Box::new(bit(rng)))];
                let value = match rng.random_range(0..3) {
                    0 => BitExpression::Xor(parts),
                    1 => BitExpression::And(parts),
                    _ => BitExpression::Or(parts),
                };
                Kind::Assign {
                    bit: rng.random_range(0..bits),
                    value: Arc::new(value),
                }
            }
            16 if menu.damping => Kind::Damping {
                qubit,
                gamma: rng.random::<f64>() * 0.6,
            },
            _ => Kind::Pauli(random_channel(rng, qubits)),
        };
        let structural = matches!(
            kind,
            Kind::Measure { .. } | Kind::Reset { .. } | Kind::Damping { .. }
        );
        let conditional = rng.random_bool(0.3) && (menu.branches || !structural);
        let condition = conditional.then(|| rng.random_range(0..bits));
        instructions.push(Instruction {
            kind,
            condition,
            operation,
        });
    }
    for qubit in 0..qubits {
        let kind = Kind::Measure {
            qubit,
            bit: Some(qubit),
            flip: ReadoutFlip::default(),
        };
        instructions.push(Instruction {
            kind,
            condition: None,
            operation: 0,
        });
    }
    NoisyCircuit {
        instructions,
        warnings: Vec::new(),
    }
}
