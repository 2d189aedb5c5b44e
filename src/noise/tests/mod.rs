//! Tests of the noise file and of attaching, on circuits built by hand.

mod attachment;
mod laws;
mod malformed;
mod matching;

use std::sync::Arc;

use smallvec::SmallVec;

use crate::circuit::{
    Action, AnnotatedNoise, Circuit, Diagnostic, Edge, Gate, Operation, Qubits, Span, parse_channel,
};

use super::{
    Instruction, Kind, NoiseFile, NoisyCircuit, PauliChannel, PauliChoices, ReadoutFlip, attach,
};

/// A circuit on so many qubits of a register `q`.
fn circuit(qubits: usize, actions: impl IntoIterator<Item = Action>) -> Circuit {
    let operation = |(line, action)| Operation {
        action,
        condition: None,
        noise: None,
        span: Span::new(line, line + 1),
    };
    Circuit {
        name: "test".into(),
        source: Arc::from("\n".repeat(100)),
        qubits: (0..qubits).map(|index| format!("q[{index}]")).collect(),
        registers: Vec::new(),
        bits: 8,
        operations: actions.into_iter().enumerate().map(operation).collect(),
        warnings: Vec::new(),
    }
}

fn gate(name: &str, parameters: &[f64], qubits: &[u32]) -> Action {
    Action::Gate {
        gate: Gate::from_name(name).expect("a library gate"),
        parameters: SmallVec::from_slice(parameters),
        qubits: Qubits::from_slice(qubits),
    }
}

fn call(name: &str, qubits: &[u32], edge: Edge) -> Action {
    Action::Call {
        name: name.into(),
        qubits: Qubits::from_slice(qubits),
        edge,
    }
}

fn measure(qubit: u32, bit: Option<u32>) -> Action {
    Action::Measure { qubit, bit }
}

/// Annotates one operation.
fn annotate(circuit: &mut Circuit, index: usize, before: &[&str], after: &[&str]) {
    let calls = |texts: &[&str]| {
        let parse = |text: &&str| parse_channel(text).expect("a channel");
        texts.iter().map(parse).collect()
    };
    circuit.operations[index].noise = Some(Box::new(AnnotatedNoise {
        before: calls(before),
        after: calls(after),
    }));
}

/// One annotated statement, attached.
fn annotated(action: Action, after: &str) -> Result<NoisyCircuit, Vec<Diagnostic>> {
    let mut circuit = circuit(40, [action]);
    annotate(&mut circuit, 0, &[], &[after]);
    attach(&circuit, None)
}

fn with_file(circuit: &Circuit, text: &str) -> NoisyCircuit {
    let file = NoiseFile::parse(text).unwrap_or_else(|errors| panic!("{errors:#?}"));
    attach(circuit, Some(&file)).unwrap_or_else(|errors| panic!("{errors:#?}"))
}

fn rule(on: &str, channel: &str, more: &str) -> String {
    format!("[[rule]]\non = {on}\nchannel = \"{channel}\"\n{more}\n")
}

/// Pauli letters and probabilities of a listed channel, in order of the text.
fn listed(channel: &PauliChannel) -> Vec<(String, f64)> {
    let PauliChoices::Listed(words) = &channel.choices else {
        panic!("expected a list, found {channel:?}");
    };
    let text = |word: &super::PauliWord| {
        let letters = (0..channel.qubits.len()).map(|place| {
            crate::circuit::Pauli::from_parts(word.x >> place & 1 == 1, word.z >> place & 1 == 1)
                .letter()
        });
        letters.collect::<String>()
    };
    let mut words: Vec<_> = words.iter().map(|(word, p)| (text(word), *p)).collect();
    words.sort_by(|a, b| a.0.cmp(&b.0));
    words
}

/// An instruction in a few words, channels with their qubits.
fn short(instruction: &Instruction) -> String {
    let when = match instruction.condition {
        Some(bit) => format!(" if {bit}"),
        None => String::new(),
    };
    let what = match &instruction.kind {
        Kind::Clifford(clifford) => format!("{clifford:?}"),
        Kind::Rotation { axis, angle } => {
            let letters = axis.iter().map(|(q, p)| format!("{}{q}", p.letter()));
            format!("rotation {} {angle:.4}", letters.collect::<String>())
        }
        Kind::Ccz(qubits) => format!("ccz {qubits:?}"),
        Kind::Measure { qubit, bit, flip } => {
            let ReadoutFlip {
                zero_to_one,
                one_to_zero,
            } = flip;
            format!("measure {qubit} {bit:?} {zero_to_one:.6} {one_to_zero:.6}")
        }
        Kind::Reset { qubit } => format!("reset {qubit}"),
        Kind::Assign { bit, .. } => format!("assign {bit}"),
        Kind::Damping { qubit, gamma } => format!("damping {qubit} {gamma:.6}"),
        Kind::Pauli(channel) => match &channel.choices {
            PauliChoices::Uniform(p) => format!("uniform {:?} {p}", channel.qubits),
            PauliChoices::Listed(_) => {
                let words = listed(channel);
                let words = words.iter().map(|(word, p)| format!(" {word}={p:.6}"));
                format!("pauli {:?}{}", channel.qubits, words.collect::<String>())
            }
        },
    };
    what + &when
}

fn shorts(noisy: &NoisyCircuit) -> Vec<String> {
    noisy.instructions.iter().map(short).collect()
}
