//! Channels at their places.
//!
//! Around every statement, in this order: annotated channels before it, rules
//! with `place = "before"` in file order, the statement, annotated channels
//! after it, rules with `place = "after"` in file order. A channel of a
//! conditional statement carries its condition. The channels of a call of a
//! gate defined in the circuit stand around its whole body; calls inside the
//! body are statements of their own.

use std::collections::HashSet;

use smallvec::SmallVec;

use crate::circuit::{
    Action, ChannelCall, Circuit, Clifford, Diagnostic, Edge, Elementary, Operation, PauliProduct,
    Severity, Source, Span,
};

use super::channels::Channel;
use super::file::{NoiseFile, Place};
use super::place::{Spot, Unfit};
use super::rules::{Rules, Statement};
use super::{Instruction, Kind, NoisyCircuit, ReadoutFlip};

/// The most errors worth showing.
const MOST_ERRORS: usize = 100;

/// Takes the circuit apart into elementary gates and puts every annotated
/// channel and every matching rule where it acts.
///
/// # Errors
/// Channels that do not exist, have numbers out of range, or cannot act on
/// their statement; rules about qubits the circuit does not have.
pub fn attach(
    circuit: &Circuit,
    noise_file: Option<&NoiseFile>,
) -> Result<NoisyCircuit, Vec<Diagnostic>> {
    let mut messages = Messages::default();
    let mut attacher = Attacher {
        circuit,
        rules: Rules::new(circuit, noise_file, &mut messages),
        messages,
        out: Vec::with_capacity(circuit.operations.len()),
    };
    for (index, operation) in circuit.operations.iter().enumerate() {
        attacher.operation(index as u32, operation);
        if attacher.messages.errors >= MOST_ERRORS {
            break;
        }
    }
    attacher.finish()
}

/// Errors and warnings, each told once however often its place is unrolled.
#[derive(Default)]
pub(super) struct Messages {
    list: Vec<Diagnostic>,
    told: HashSet<(Option<Span>, String)>,
    errors: usize,
}

impl Messages {
    pub(super) fn tell(&mut self, message: Diagnostic) {
        if self.told.insert((message.span, message.message.clone())) {
            self.errors += usize::from(message.severity == Severity::Error);
            self.list.push(message);
        }
    }
}

/// Where a channel was written down.
#[derive(Clone, Copy)]
struct Origin {
    span: Span,
    source: Source,
}

impl Origin {
    fn error(self, message: impl Into<String>, help: impl Into<String>) -> Diagnostic {
        let mut error = Diagnostic::error(self.span, message).with_help(help);
        error.source = self.source;
        error
    }
}

struct Attacher<'a> {
    circuit: &'a Circuit,
    rules: Rules<'a>,
    messages: Messages,
    out: Vec<Instruction>,
}

impl Attacher<'_> {
    fn operation(&mut self, index: u32, operation: &Operation) {
        let (qubits, delay): (SmallVec<[u32; 4]>, _) = match &operation.action {
            Action::Gate { qubits, .. }
            | Action::Call { qubits, .. }
            | Action::Barrier { qubits } => (qubits.clone(), None),
            Action::Measure { qubit, .. } | Action::Reset { qubit } => {
                (SmallVec::from_slice(&[*qubit]), None)
            }
            Action::Delay { qubit, seconds } => (SmallVec::from_slice(&[*qubit]), Some(*seconds)),
            Action::Assign { .. } => (SmallVec::new(), None),
        };
        let spot = Spot {
            qubits: &qubits,
            delay,
            condition: operation.condition,
            operation: index,
        };
        let statement = Statement::of(&operation.action);
        let (starts, ends) = match operation.action {
            Action::Call { edge, .. } => (edge == Edge::Start, edge == Edge::End),
            _ => (true, true),
        };
        if starts {
            self.channels(operation, &spot, statement, Place::Before);
        }
        self.statement(operation, &spot, statement);
        if ends {
            self.channels(operation, &spot, statement, Place::After);
        }
    }

    /// Puts all channels of one side of a statement.
    fn channels(
        &mut self,
        operation: &Operation,
        spot: &Spot<'_>,
        statement: Option<Statement<'_>>,
        place: Place,
    ) {
        for call in annotated(operation, place) {
            let origin = Origin {
                span: call.span,
                source: Source::Circuit,
            };
            match Channel::judge(call) {
                Ok(channel) => {
                    if let Err(error) = fits(&operation.action, &channel, place) {
                        self.messages.tell(origin.error(error.message, error.help));
                        continue;
                    }
                    if let Err(error) = channel.put(spot, &mut self.out) {
                        self.messages.tell(origin.error(error.message, error.help));
                    }
                }
                Err(error) => self.messages.tell(error),
            }
        }
        let Some(statement) = statement else { return };
        for index in self.rules.matching(statement).iter().copied() {
            if self.rules.place(index) != place || !self.rules.applies(index, spot.qubits) {
                continue;
            }
            let (channel, span) = self.rules.channel(index);
            if let Err(error) = channel.put(spot, &mut self.out) {
                let origin = Origin {
                    span,
                    source: Source::Noise,
                };
                let line = operation.span.line_and_column(&self.circuit.source).0;
                let message = format!("{} (line {line} of the circuit)", error.message);
                self.messages.tell(origin.error(message, error.help));
                self.rules.disable(index);
            }
        }
    }

    /// The statement itself.
    fn statement(
        &mut self,
        operation: &Operation,
        spot: &Spot<'_>,
        statement: Option<Statement<'_>>,
    ) {
        match &operation.action {
            Action::Gate {
                gate,
                parameters,
                qubits,
            } => {
                for elementary in gate.expand(parameters) {
                    if let Elementary::Rotation { angle, .. } = elementary
                        && !angle.is_finite()
                    {
                        let error = Diagnostic::error(operation.span, "an angle is not finite")
                            .with_help("check the arguments of this gate");
                        self.messages.tell(error);
                        continue;
                    }
                    self.push(spot, on_qubits(&elementary, qubits));
                }
            }
            Action::Measure { qubit, bit } => {
                let flip = self.readout_flip(operation, spot, statement, bit.is_none());
                let (qubit, bit) = (*qubit, *bit);
                self.push(spot, Kind::Measure { qubit, bit, flip });
            }
            Action::Reset { qubit } => self.push(spot, Kind::Reset { qubit: *qubit }),
            Action::Assign { bit, value } => {
                let value = value.clone();
                self.push(spot, Kind::Assign { bit: *bit, value });
            }
            Action::Call { .. } | Action::Delay { .. } | Action::Barrier { .. } => {}
        }
    }

    fn push(&mut self, spot: &Spot<'_>, kind: Kind) {
        self.out.push(Instruction {
            kind,
            condition: spot.condition,
            operation: spot.operation,
        });
    }

    /// All readout flips of a measurement, one after another.
    fn readout_flip(
        &mut self,
        operation: &Operation,
        spot: &Spot<'_>,
        statement: Option<Statement<'_>>,
        discarded: bool,
    ) -> ReadoutFlip {
        const MESSAGE: &str = "readout-flip on a measurement whose outcome is discarded";
        const HELP: &str = "it does nothing; record the outcome in a bit if it should count";
        let mut total = ReadoutFlip::default();
        for call in annotated(operation, Place::After) {
            // A call that is wrong has been told where the other channels are put.
            if let Ok(Channel::ReadoutFlip(flip)) = Channel::judge(call) {
                total = total.then(flip);
                if discarded {
                    let warning = Diagnostic::warning(call.span, MESSAGE).with_help(HELP);
                    self.messages.tell(warning);
                }
            }
        }
        let Some(statement) = statement else {
            return total;
        };
        for index in self.rules.matching(statement).iter().copied() {
            let (channel, span) = self.rules.channel(index);
            if let Channel::ReadoutFlip(flip) = *channel
                && self.rules.applies(index, spot.qubits)
            {
                total = total.then(flip);
                if discarded {
                    let warning = Diagnostic::warning(span, MESSAGE).with_help(HELP);
                    self.messages.tell(warning.in_noise_file());
                }
            }
        }
        total
    }

    fn finish(mut self) -> Result<NoisyCircuit, Vec<Diagnostic>> {
        if self.messages.errors == 0 {
            self.rules.warn_of_idle(&mut self.messages);
            return Ok(NoisyCircuit {
                instructions: self.out,
                warnings: self.messages.list,
            });
        }
        Err(self.messages.list)
    }
}

fn annotated(operation: &Operation, place: Place) -> &[ChannelCall] {
    match (&operation.noise, place) {
        (Some(noise), Place::Before) => &noise.before,
        (Some(noise), Place::After) => &noise.after,
        (None, _) => &[],
    }
}

/// Whether an annotated channel can stand on this side of this statement.
fn fits(action: &Action, channel: &Channel, place: Place) -> Result<(), Unfit> {
    let unfit = |message: &str, help| {
        Err(Unfit {
            message: message.into(),
            help,
        })
    };
    match (channel, action) {
        (_, Action::Assign { .. }) => unfit(
            "noise on a classical assignment",
            "annotate a statement that acts on qubits",
        ),
        (Channel::ReadoutFlip(_), Action::Measure { .. }) if place == Place::Before => unfit(
            "readout-flip acts on the recorded bit, it cannot come before the measurement",
            "write @noise readout-flip(…)",
        ),
        (Channel::ReadoutFlip(_), Action::Measure { .. }) => Ok(()),
        (Channel::ReadoutFlip(_), _) => unfit(
            "readout-flip is about recorded bits, and this statement measures nothing",
            "annotate the measurement",
        ),
        _ => Ok(()),
    }
}

/// An elementary gate with positions replaced by the qubits of the call.
fn on_qubits(elementary: &Elementary<u8>, qubits: &[u32]) -> Kind {
    let at = |position: u8| qubits[usize::from(position)];
    let product = |axis: &PauliProduct<u8>| -> PauliProduct {
        axis.iter().map(|&(q, letter)| (at(q), letter)).collect()
    };
    match elementary {
        Elementary::Rotation { axis, angle } => Kind::Rotation {
            axis: product(axis),
            angle: *angle,
        },
        Elementary::Ccz([a, b, c]) => Kind::Ccz([at(*a), at(*b), at(*c)]),
        Elementary::Clifford(clifford) => Kind::Clifford(match clifford {
            Clifford::X(q) => Clifford::X(at(*q)),
            Clifford::Y(q) => Clifford::Y(at(*q)),
            Clifford::Z(q) => Clifford::Z(at(*q)),
            Clifford::H(q) => Clifford::H(at(*q)),
            Clifford::S(q) => Clifford::S(at(*q)),
            Clifford::Sdg(q) => Clifford::Sdg(at(*q)),
            Clifford::Cx(a, b) => Clifford::Cx(at(*a), at(*b)),
            Clifford::Cz(a, b) => Clifford::Cz(at(*a), at(*b)),
            Clifford::Swap(a, b) => Clifford::Swap(at(*a), at(*b)),
            Clifford::QuarterTurn(axis) => Clifford::QuarterTurn(product(axis)),
        }),
    }
}
