//! Tests of the rewrites against density matrices, and of single values
//! against published formulas.

pub(crate) mod dense;
mod laws;
mod random;
mod values;

use crate::circuit::{Pauli, PauliProduct, Qubits};
use crate::noise::{Instruction, Kind, NoisyCircuit, PauliChannel, PauliChoices, PauliWord};

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

/// Unconditional instructions, each an operation of its own.
fn circuit(kinds: impl IntoIterator<Item = Kind>) -> NoisyCircuit {
    let instructions = kinds.into_iter().enumerate();
    NoisyCircuit {
        instructions: instructions
            .map(|(operation, kind)| Instruction {
                kind,
                condition: None,
                operation: operation as u32,
            })
            .collect(),
        warnings: Vec::new(),
    }
}

fn rotation(letters: &str, angle: f64) -> Kind {
    Kind::Rotation {
        axis: product(letters),
        angle,
    }
}

fn word(letters: &str) -> PauliWord {
    let mut word = PauliWord::default();
    for &(qubit, letter) in &product(letters) {
        word.x |= u32::from(letter.x()) << qubit;
        word.z |= u32::from(letter.z()) << qubit;
    }
    word
}

fn channel(qubits: &[u32], words: &[(&str, f64)]) -> Kind {
    Kind::Pauli(PauliChannel {
        qubits: Qubits::from_slice(qubits),
        choices: PauliChoices::Listed(words.iter().map(|&(text, p)| (word(text), p)).collect()),
    })
}

fn depolarizing(qubit: u32, p: f64) -> Kind {
    let each = p / 3.0;
    channel(&[qubit], &[("X", each), ("Y", each), ("Z", each)])
}
