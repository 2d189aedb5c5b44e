//! The circuit: what the file says, as a flat list of operations.
//!
//! The front end reads OpenQASM 3 (or 2) text and unrolls loops, gate
//! definitions, broadcasts and conditions into [`Operation`]s. Library gates
//! stay whole, under the name they were called by, because noise is attached to
//! calls; [`Gate::expand`] takes a gate apart into Clifford gates, Pauli
//! rotations and CCZ when the noise is in place.
//!
//! This module knows nothing of noise channels, sites or simulation: an
//! annotation is kept as its name and evaluated arguments.

mod ast;
pub mod diagnostic;
pub mod elementary;
mod gate;
mod lexer;
mod limits;
mod lower;
mod parse;
mod parser;
#[cfg(test)]
mod tests;

use std::sync::Arc;

use smallvec::SmallVec;

pub use diagnostic::{Diagnostic, Severity, Source, Span};
pub use elementary::{Clifford, Elementary, Pauli, PauliProduct};
pub use gate::{Expansion, Gate, Parameters};
pub use parse::{ParseOptions, parse, parse_channel};

/// A circuit as flat operations.
#[derive(Debug, Clone)]
pub struct Circuit {
    /// Name shown in messages, usually the file name.
    pub name: String,
    /// The full text the circuit was read from.
    pub source: Arc<str>,
    /// One name a qubit, `q[3]` or `q`, in order of declaration.
    pub qubits: Vec<String>,
    /// Every declared bit register, in order of declaration.
    pub registers: Vec<Register>,
    /// Number of classical bits: those of the registers first, then hidden bits
    /// that hold the value of a condition for the length of its block.
    pub bits: usize,
    /// The operations in the order they run.
    pub operations: Vec<Operation>,
    /// Things worth telling that do not stop the work.
    pub warnings: Vec<Diagnostic>,
}

/// A declared bit register.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct Register {
    /// Name in the file.
    pub name: String,
    /// Index of its bit 0 among the circuit's bits.
    pub first: usize,
    /// Number of bits.
    pub width: usize,
    /// What the register is for.
    pub role: Role,
    /// Whether its bits are written to the result file.
    pub recorded: bool,
}

/// What a bit register is for.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Hash)]
pub enum Role {
    /// A plain record of outcomes.
    Record,
    /// Parity checks, all 0 in a fault-free run (`@check`).
    Check,
    /// Logical readouts (`@logical`).
    Logical,
}

impl Role {
    /// The word used in files and summaries.
    pub fn word(self) -> &'static str {
        match self {
            Role::Record => "record",
            Role::Check => "check",
            Role::Logical => "logical",
        }
    }
}

/// One step of the circuit, on resolved qubits and bits.
#[derive(Debug, Clone)]
pub struct Operation {
    /// What is done.
    pub action: Action,
    /// The classical bit that must be 1 for the operation to happen, if any.
    pub condition: Option<u32>,
    /// Annotated noise, if any.
    pub noise: Option<Box<AnnotatedNoise>>,
    /// Place in the source.
    pub span: Span,
}

/// Qubit indices of one call.
pub type Qubits = SmallVec<[u32; 4]>;

/// What an operation does.
#[derive(Debug, Clone)]
pub enum Action {
    /// A library gate, called whole.
    Gate {
        /// Which gate.
        gate: Gate,
        /// Its angles in radians, as many as [`Gate::parameters`] says.
        parameters: SmallVec<[f64; 4]>,
        /// Its qubits, controls first.
        qubits: Qubits,
    },
    /// The start or the end of a call of a gate defined in the file. The calls
    /// of its body stand between the two.
    Call {
        /// Name of the definition.
        name: Arc<str>,
        /// Qubits of the call.
        qubits: Qubits,
        /// Which end of the call this is.
        edge: Edge,
    },
    /// A measurement of Z.
    Measure {
        /// The qubit.
        qubit: u32,
        /// Where the outcome goes; nowhere if discarded.
        bit: Option<u32>,
    },
    /// Reset to |0⟩.
    Reset {
        /// The qubit.
        qubit: u32,
    },
    /// Waiting.
    Delay {
        /// The qubit.
        qubit: u32,
        /// Length in seconds.
        seconds: f64,
    },
    /// A barrier; it does nothing but carry annotated noise.
    Barrier {
        /// The qubits.
        qubits: Qubits,
    },
    /// Classical assignment of one bit.
    Assign {
        /// The bit written.
        bit: u32,
        /// Its new value.
        value: Arc<BitExpression>,
    },
}

/// Which end of a call of a user-defined gate.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Edge {
    /// Before the body.
    Start,
    /// After the body.
    End,
}

/// A Boolean formula over classical bits.
#[derive(Debug, Clone, PartialEq, Eq)]
pub enum BitExpression {
    /// A constant.
    Constant(bool),
    /// The value of a bit.
    Bit(u32),
    /// Negation.
    Not(Box<BitExpression>),
    /// Parity of any number of operands.
    Xor(Vec<BitExpression>),
    /// All operands.
    And(Vec<BitExpression>),
    /// Any operand.
    Or(Vec<BitExpression>),
}

impl BitExpression {
    /// Value of the formula when bit `i` has the value `bit(i)`.
    pub fn evaluate(&self, bit: &impl Fn(u32) -> bool) -> bool {
        match self {
            BitExpression::Constant(value) => *value,
            BitExpression::Bit(index) => bit(*index),
            BitExpression::Not(inner) => !inner.evaluate(bit),
            BitExpression::Xor(parts) => parts
                .iter()
                .fold(false, |sum, part| sum ^ part.evaluate(bit)),
            BitExpression::And(parts) => parts.iter().all(|part| part.evaluate(bit)),
            BitExpression::Or(parts) => parts.iter().any(|part| part.evaluate(bit)),
        }
    }
}

/// Noise annotated on one operation.
#[derive(Debug, Clone, Default)]
pub struct AnnotatedNoise {
    /// `@noise.before`, in the order written.
    pub before: Vec<ChannelCall>,
    /// `@noise`, in the order written.
    pub after: Vec<ChannelCall>,
}

/// A channel as written, `NAME(ARGUMENTS)`, arguments evaluated but not judged.
#[derive(Debug, Clone, PartialEq)]
pub struct ChannelCall {
    /// Name of the channel as written, hyphens included.
    pub name: String,
    /// The arguments in order.
    pub arguments: Vec<ChannelArgument>,
    /// Place in the text it was read from.
    pub span: Span,
}

/// One argument of a channel.
#[derive(Debug, Clone, PartialEq)]
pub struct ChannelArgument {
    /// `NAME=` in front of the value, if any.
    pub name: Option<String>,
    /// The value.
    pub value: ChannelValue,
    /// Place in the text it was read from.
    pub span: Span,
}

/// Value of a channel argument.
#[derive(Debug, Clone, PartialEq)]
pub enum ChannelValue {
    /// A number: probability, or angle in radians.
    Number(f64),
    /// A duration, in seconds.
    Duration(f64),
    /// A bare word, such as the axis `x`.
    Word(String),
}
