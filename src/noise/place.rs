//! A channel on the qubits of one statement, as instructions.
//!
//! Depolarizing with probability p applies each of the 4^m − 1 Pauli words
//! that are not the identity with probability p/(4^m − 1); a word survives
//! with factor 1 − p·4^m/(4^m − 1) (Phys. Rev. A 77, 012307 (2008)).
//! Relaxation for a time t is amplitude damping with γ = 1 − e^{−t/t1}, then
//! dephasing with (1 − e^{−t/t2 + t/(2·t1)})/2, so that coherences shrink by
//! e^{−t/t2} in all (textbook). What has probability 0 leaves nothing behind.

use smallvec::smallvec;

use crate::circuit::{Pauli, Qubits};

use super::channels::Channel;
use super::{Instruction, Kind, PauliChannel, PauliChoices, PauliWord};

/// Where and when a channel acts.
pub(super) struct Spot<'a> {
    /// The qubits of the statement.
    pub qubits: &'a [u32],
    /// Length of the statement in seconds if it is a delay.
    pub delay: Option<f64>,
    /// The bit the statement depends on.
    pub condition: Option<u32>,
    /// Index of the statement.
    pub operation: u32,
}

/// Why a channel cannot act on a statement.
#[derive(Debug, PartialEq, Eq)]
pub(super) struct Unfit {
    /// What was found and expected.
    pub message: String,
    /// What to do.
    pub help: &'static str,
}

/// Depolarizing on more qubits than this is not listed word by word.
const LISTED_QUBITS: usize = 3;

impl Channel {
    /// Appends what the channel does at `spot` to `out`. A readout flip does
    /// nothing here: it belongs to the measurement itself.
    pub(super) fn put(&self, spot: &Spot<'_>, out: &mut Vec<Instruction>) -> Result<(), Unfit> {
        let mut push = |kind| {
            out.push(Instruction {
                kind,
                condition: spot.condition,
                operation: spot.operation,
            })
        };
        match *self {
            Channel::Depolarizing(p) => {
                if let Some(channel) = depolarizing(spot.qubits, p)? {
                    push(Kind::Pauli(channel));
                }
            }
            Channel::DepolarizingEach(p) => {
                for &qubit in spot.qubits {
                    if let Some(channel) = depolarizing(&[qubit], p)? {
                        push(Kind::Pauli(channel));
                    }
                }
            }
            Channel::Flip(pauli, p) => {
                for &qubit in spot.qubits {
                    if p > 0.0 {
                        push(flip(qubit, pauli, p));
                    }
                }
            }
            Channel::Words { length, ref words } => {
                if let Some(channel) = listed(spot.qubits, length, words)? {
                    push(Kind::Pauli(channel));
                }
            }
            Channel::AmplitudeDamping(gamma) => {
                for &qubit in spot.qubits {
                    if gamma > 0.0 {
                        push(Kind::Damping { qubit, gamma });
                    }
                }
            }
            Channel::Relaxation { t1, t2, time } => {
                let time = time.or(spot.delay).ok_or_else(no_time)?;
                let gamma = -(-time / t1).exp_m1();
                let dephasing = -(time / (2.0 * t1) - time / t2).exp_m1() / 2.0;
                for &qubit in spot.qubits {
                    if gamma > 0.0 {
                        push(Kind::Damping { qubit, gamma });
                    }
                    if dephasing > 0.0 {
                        push(flip(qubit, Pauli::Z, dephasing));
                    }
                }
            }
            Channel::OverRotation(pauli, angle) => {
                for &qubit in spot.qubits {
                    if angle != 0.0 {
                        let axis = smallvec![(qubit, pauli)];
                        push(Kind::Rotation { axis, angle });
                    }
                }
            }
            Channel::ReadoutFlip(_) => {}
        }
        Ok(())
    }
}

fn no_time() -> Unfit {
    Unfit {
        message: "relaxation(t1, t2) takes its time from a delay, and this is none".into(),
        help: "write relaxation(t1, t2, time) with the time the statement takes",
    }
}

fn word(letters: impl IntoIterator<Item = Pauli>) -> PauliWord {
    let mut word = PauliWord::default();
    for (position, letter) in letters.into_iter().enumerate() {
        word.x |= u32::from(letter.x()) << position;
        word.z |= u32::from(letter.z()) << position;
    }
    word
}

fn flip(qubit: u32, pauli: Pauli, p: f64) -> Kind {
    Kind::Pauli(PauliChannel {
        qubits: smallvec![qubit],
        choices: PauliChoices::Listed(vec![(word([pauli]), p)]),
    })
}

fn depolarizing(qubits: &[u32], p: f64) -> Result<Option<PauliChannel>, Unfit> {
    let count = qubits.len();
    if count > PauliChannel::MAX_QUBITS {
        return Err(Unfit {
            message: format!(
                "depolarizing on {count} qubits jointly, at most {} are possible",
                PauliChannel::MAX_QUBITS
            ),
            help: "use depolarizing-each(p), which acts on each qubit on its own",
        });
    }
    if p == 0.0 || count == 0 {
        return Ok(None);
    }
    let choices = if count <= LISTED_QUBITS {
        let ends = 1u32 << count;
        let each = p / f64::from(ends * ends - 1);
        let words = (1..ends * ends).map(|code| PauliWord {
            x: code % ends,
            z: code / ends,
        });
        PauliChoices::Listed(words.map(|word| (word, each)).collect())
    } else {
        PauliChoices::Uniform(p)
    };
    let qubits = Qubits::from_slice(qubits);
    Ok(Some(PauliChannel { qubits, choices }))
}

fn listed(
    qubits: &[u32],
    length: usize,
    words: &[(Vec<Pauli>, f64)],
) -> Result<Option<PauliChannel>, Unfit> {
    if qubits.len() != length {
        return Err(Unfit {
            message: format!(
                "Pauli words of {length} letters on a statement on {} qubits",
                qubits.len()
            ),
            help: "letter i belongs to qubit i of the statement (measure, reset and delay act on one qubit at a time)",
        });
    }
    let choices: Vec<(PauliWord, f64)> = words
        .iter()
        .map(|(letters, p)| (word(letters.iter().copied()), *p))
        .filter(|&(word, p)| word != PauliWord::default() && p > 0.0)
        .collect();
    Ok((!choices.is_empty()).then(|| PauliChannel {
        qubits: Qubits::from_slice(qubits),
        choices: PauliChoices::Listed(choices),
    }))
}
