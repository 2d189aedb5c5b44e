//! Noise: channels, the noise file, and their places in the circuit.
//!
//! [`attach()`] takes the circuit's calls apart into elementary gates and puts
//! every annotated channel and every matching rule of the noise file where it
//! acts. What comes out is a plain list of [`Instruction`]s: Clifford gates,
//! rotations by any angle, CCZ, measurements, resets, classical assignments,
//! Pauli channels and amplitude damping. Coherent over-rotation has become
//! rotations, relaxation has become damping and dephasing.
//!
//! This module knows the circuit, and nothing of sites or simulation.

mod attach;
mod channels;
mod file;
mod place;
mod rules;
mod suggest;
#[cfg(test)]
mod tests;

use std::sync::Arc;

use crate::circuit::{BitExpression, Clifford, PauliProduct, Qubits};

pub use attach::attach;
pub use file::NoiseFile;

/// A circuit with its noise in place.
#[derive(Debug, Clone)]
pub struct NoisyCircuit {
    /// What happens, in order.
    pub instructions: Vec<Instruction>,
    /// Things worth telling that do not stop the work.
    pub warnings: Vec<crate::circuit::Diagnostic>,
}

/// One step of a noisy circuit.
#[derive(Debug, Clone)]
pub struct Instruction {
    /// What is done.
    pub kind: Kind,
    /// The classical bit that must be 1 for it to happen, if any.
    pub condition: Option<u32>,
    /// Index of the circuit operation it comes from.
    pub operation: u32,
}

/// What an instruction does.
#[derive(Debug, Clone)]
pub enum Kind {
    /// A Clifford gate.
    Clifford(Clifford),
    /// exp(−i·angle·P/2).
    Rotation {
        /// P.
        axis: PauliProduct,
        /// The angle in radians, any value.
        angle: f64,
    },
    /// −1 on |111⟩.
    Ccz([u32; 3]),
    /// A measurement of Z.
    Measure {
        /// The qubit.
        qubit: u32,
        /// Where the recorded outcome goes; nowhere if discarded.
        bit: Option<u32>,
        /// Chance that the recorded bit is flipped.
        flip: ReadoutFlip,
    },
    /// Reset to |0⟩.
    Reset {
        /// The qubit.
        qubit: u32,
    },
    /// Classical assignment.
    Assign {
        /// The bit written.
        bit: u32,
        /// Its new value.
        value: Arc<BitExpression>,
    },
    /// A random Pauli.
    Pauli(PauliChannel),
    /// Amplitude damping: decay from 1 to 0 with probability `gamma`.
    Damping {
        /// The qubit.
        qubit: u32,
        /// Decay probability, from 0 (exclusive) to 1.
        gamma: f64,
    },
}

/// Readout error of one measurement. Two flips in a row compose.
#[derive(Debug, Clone, Copy, PartialEq, Default)]
pub struct ReadoutFlip {
    /// Probability of recording 1 when the state gave 0.
    pub zero_to_one: f64,
    /// Probability of recording 0 when the state gave 1.
    pub one_to_zero: f64,
}

impl ReadoutFlip {
    /// This flip followed by another of the bit it leaves.
    pub fn then(self, next: ReadoutFlip) -> ReadoutFlip {
        let compose = |one: f64, back: f64, forth: f64| one * (1.0 - back) + (1.0 - one) * forth;
        ReadoutFlip {
            zero_to_one: compose(self.zero_to_one, next.one_to_zero, next.zero_to_one),
            one_to_zero: compose(self.one_to_zero, next.zero_to_one, next.one_to_zero),
        }
    }
}

/// A random Pauli on the qubits of one call.
#[derive(Debug, Clone, PartialEq)]
pub struct PauliChannel {
    /// The qubits; at most [`PauliChannel::MAX_QUBITS`].
    pub qubits: Qubits,
    /// What may happen.
    pub choices: PauliChoices,
}

impl PauliChannel {
    /// The most qubits one channel may act on jointly.
    pub const MAX_QUBITS: usize = 32;
}

/// The alternatives of a Pauli channel.
#[derive(Debug, Clone, PartialEq)]
pub enum PauliChoices {
    /// Each word with its probability (> 0), identity left out, every word at
    /// most once, sum at most 1.
    Listed(Vec<(PauliWord, f64)>),
    /// With this probability, one of the 4^m − 1 words that are not the
    /// identity, uniformly. Used where the list would be long (m > 3).
    Uniform(f64),
}

/// Pauli letters on the qubits of a channel: bit i of `x` and `z` belong to
/// qubit i of the channel.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Hash, PartialOrd, Ord, Default)]
pub struct PauliWord {
    /// Which qubits have an X part.
    pub x: u32,
    /// Which qubits have a Z part.
    pub z: u32,
}
