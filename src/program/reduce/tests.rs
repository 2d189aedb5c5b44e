//! The law of the recorded bits with and without reduction, by density
//! matrices, and extents of circuits whose reduction can be told by hand.

mod random;
mod values;

use crate::circuit::{Clifford, Pauli, PauliProduct, Qubits};
use crate::noise::{
    Instruction, Kind, NoisyCircuit, PauliChannel, PauliChoices, PauliWord, ReadoutFlip,
};

/// A product of letters from qubit 0 on, such as "ZIX".
fn product(letters: &str) -> PauliProduct {
    let letter = |letter| match letter {
        'X' => Pauli::X,
        'Y' => Pauli::Y,
        'Z' => Pauli::Z,
        _ => Pauli::I,
    };
    letters
        .chars()
        .enumerate()
        .map(|(qubit, text)| (qubit as u32, letter(text)))
        .filter(|&(_, letter)| letter != Pauli::I)
        .collect()
}

fn rotation(letters: &str, angle: f64) -> Kind {
    Kind::Rotation {
        axis: product(letters),
        angle,
    }
}

fn measure(qubit: u32, bit: u32) -> Kind {
    Kind::Measure {
        qubit,
        bit: Some(bit),
        flip: ReadoutFlip::default(),
    }
}

fn flip(qubit: u32, x: u32, z: u32, p: f64) -> Kind {
    Kind::Pauli(PauliChannel {
        qubits: Qubits::from_slice(&[qubit]),
        choices: PauliChoices::Listed(vec![(PauliWord { x, z }, p)]),
    })
}

fn clifford(gate: Clifford) -> Kind {
    Kind::Clifford(gate)
}

fn circuit(kinds: impl IntoIterator<Item = (Kind, Option<u32>)>) -> NoisyCircuit {
    NoisyCircuit {
        instructions: kinds
            .into_iter()
            .enumerate()
            .map(|(operation, (kind, condition))| Instruction {
                kind,
                condition,
                operation: operation as u32,
            })
            .collect(),
        warnings: Vec::new(),
    }
}
