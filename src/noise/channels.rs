//! Channel names and arguments: what `depolarizing(0.01)` and its kin mean.
//!
//! A [`ChannelCall`] is text with evaluated arguments; a [`Channel`] is one
//! whose name is known and whose numbers are in range. Where it acts is not
//! known here.

use crate::circuit::{ChannelArgument, ChannelCall, ChannelValue, Diagnostic, Pauli};

use super::ReadoutFlip;
use super::suggest::nearest;

/// Rounding allowed when probabilities that should sum to 1 are added up.
const SUM_SLACK: f64 = 1e-12;

/// The most letters a Pauli word may have.
const LONGEST_WORD: usize = super::PauliChannel::MAX_QUBITS;

/// A channel with its numbers in range, on qubits yet to be named.
#[derive(Debug, Clone, PartialEq)]
pub(super) enum Channel {
    /// With this probability a random non-identity Pauli on all qubits jointly.
    Depolarizing(f64),
    /// One-qubit depolarizing on each qubit.
    DepolarizingEach(f64),
    /// This Pauli with this probability, on each qubit.
    Flip(Pauli, f64),
    /// Words of equal length, each with its probability.
    Words {
        /// Letters of every word.
        length: usize,
        /// The words, none twice.
        words: Vec<(Vec<Pauli>, f64)>,
    },
    /// Decay from 1 to 0 with this probability, on each qubit.
    AmplitudeDamping(f64),
    /// Amplitude damping and dephasing of a wait, times in seconds.
    Relaxation {
        /// Energy relaxation time.
        t1: f64,
        /// Coherence time, at most 2·t1.
        t2: f64,
        /// How long; the statement's delay if absent.
        time: Option<f64>,
    },
    /// exp(−i·angle·P/2) on each qubit.
    OverRotation(Pauli, f64),
    /// The recorded bit flips.
    ReadoutFlip(ReadoutFlip),
}

/// Every channel: its name, and how to write it.
const FORMS: [(&str, &str); 10] = [
    ("depolarizing", "depolarizing(p)"),
    ("depolarizing-each", "depolarizing-each(p)"),
    ("dephasing", "dephasing(p)"),
    ("bit-flip", "bit-flip(p)"),
    ("bit-phase-flip", "bit-phase-flip(p)"),
    ("pauli", "pauli(X=p, Z=p) or pauli(XX=p, IZ=p)"),
    ("amplitude-damping", "amplitude-damping(gamma)"),
    (
        "relaxation",
        "relaxation(t1, t2) on a delay, or relaxation(t1, t2, time)",
    ),
    ("over-rotation", "over-rotation(axis, angle)"),
    ("readout-flip", "readout-flip(p) or readout-flip(p01, p10)"),
];

impl Channel {
    /// Judges a channel as written.
    ///
    /// # Errors
    /// One diagnostic, placed in the text the call was read from: unknown
    /// name, missing or superfluous argument, wrong kind of value, number out
    /// of range.
    pub(super) fn judge(call: &ChannelCall) -> Result<Channel, Diagnostic> {
        match call.name.as_str() {
            "depolarizing" => Ok(Channel::Depolarizing(only_probability(call, "p")?)),
            "depolarizing-each" => Ok(Channel::DepolarizingEach(only_probability(call, "p")?)),
            "dephasing" => Ok(Channel::Flip(Pauli::Z, only_probability(call, "p")?)),
            "bit-flip" => Ok(Channel::Flip(Pauli::X, only_probability(call, "p")?)),
            "bit-phase-flip" => Ok(Channel::Flip(Pauli::Y, only_probability(call, "p")?)),
            "pauli" => pauli(call),
            "amplitude-damping" => Ok(Channel::AmplitudeDamping(only_probability(call, "gamma")?)),
            "relaxation" => relaxation(call),
            "over-rotation" => over_rotation(call),
            "readout-flip" => readout_flip(call),
            _ => Err(unknown(call)),
        }
    }
}

fn unknown(call: &ChannelCall) -> Diagnostic {
    let names = FORMS.map(|(name, _)| name);
    let help = match nearest(&call.name, names) {
        Some(name) => format!("did you mean `{name}`?"),
        None => format!("the channels are {}", names.join(", ")),
    };
    Diagnostic::error(call.span, format!("unknown channel `{}`", call.name)).with_help(help)
}

/// How to write the channel of this call.
fn form(call: &ChannelCall) -> String {
    let form = FORMS.iter().find(|(name, _)| *name == call.name);
    format!("write {}", form.map_or("", |(_, form)| form))
}

/// Assigns arguments to parameters: those without a name by position, the
/// others by name. The first `required` parameters must be given.
fn bind<'a, const N: usize>(
    call: &'a ChannelCall,
    parameters: [&str; N],
    required: usize,
) -> Result<[Option<&'a ChannelArgument>; N], Diagnostic> {
    let mut bound = [None; N];
    for (position, argument) in call.arguments.iter().enumerate() {
        let slot = match &argument.name {
            None if position < N => position,
            None => {
                let message = format!(
                    "`{}` takes at most {N} arguments, found {}",
                    call.name,
                    call.arguments.len()
                );
                return Err(Diagnostic::error(argument.span, message).with_help(form(call)));
            }
            Some(name) => parameters
                .iter()
                .position(|parameter| parameter == name)
                .ok_or_else(|| {
                    let message = format!("`{}` has no argument `{name}`", call.name);
                    Diagnostic::error(argument.span, message).with_help(form(call))
                })?,
        };
        if bound[slot].replace(argument).is_some() {
            let message = format!("argument `{}` given twice", parameters[slot]);
            return Err(Diagnostic::error(argument.span, message).with_help(form(call)));
        }
    }
    match (0..required).find(|&slot| bound[slot].is_none()) {
        None => Ok(bound),
        Some(slot) => {
            let message = format!("`{}` needs argument `{}`", call.name, parameters[slot]);
            Err(Diagnostic::error(call.span, message).with_help(form(call)))
        }
    }
}

fn only_probability(call: &ChannelCall, parameter: &str) -> Result<f64, Diagnostic> {
    let [argument] = bind(call, [parameter], 1)?;
    probability(call, argument)
}

fn kind_of(value: &ChannelValue) -> String {
    match value {
        ChannelValue::Number(number) => format!("the number {number}"),
        ChannelValue::Duration(seconds) => format!("a duration of {seconds} s"),
        ChannelValue::Word(word) => format!("the word `{word}`"),
    }
}

fn expected(call: &ChannelCall, argument: &ChannelArgument, what: &str) -> Diagnostic {
    let message = format!("expected {what}, found {}", kind_of(&argument.value));
    Diagnostic::error(argument.span, message).with_help(form(call))
}

fn missing(call: &ChannelCall) -> Diagnostic {
    Diagnostic::error(call.span, format!("`{}` lacks an argument", call.name)).with_help(form(call))
}

fn probability(call: &ChannelCall, argument: Option<&ChannelArgument>) -> Result<f64, Diagnostic> {
    let argument = argument.ok_or_else(|| missing(call))?;
    match argument.value {
        ChannelValue::Number(p) if (0.0..=1.0).contains(&p) => Ok(p),
        _ => Err(expected(call, argument, "a probability from 0 to 1")),
    }
}

/// A duration in seconds, above 0 or, where `zero` is allowed, from 0.
fn duration(
    call: &ChannelCall,
    argument: Option<&ChannelArgument>,
    zero: bool,
) -> Result<f64, Diagnostic> {
    let argument = argument.ok_or_else(|| missing(call))?;
    match argument.value {
        ChannelValue::Duration(seconds)
            if seconds.is_finite() && (seconds > 0.0 || zero && seconds == 0.0) =>
        {
            Ok(seconds)
        }
        _ => Err(expected(call, argument, "a positive duration such as 80us")),
    }
}

fn relaxation(call: &ChannelCall) -> Result<Channel, Diagnostic> {
    let [t1_argument, t2_argument, time] = bind(call, ["t1", "t2", "time"], 2)?;
    let t1 = duration(call, t1_argument, false)?;
    let t2 = duration(call, t2_argument, false)?;
    if t2 > 2.0 * t1 * (1.0 + SUM_SLACK) {
        let span = t2_argument.map_or(call.span, |argument| argument.span);
        let message = format!("t2 = {t2:e} s is longer than 2·t1 = {:e} s", 2.0 * t1);
        return Err(Diagnostic::error(span, message)
            .with_help("no qubit keeps its coherence longer than 2·t1; lower t2 or raise t1"));
    }
    let time = match time {
        None => None,
        given => Some(duration(call, given, true)?),
    };
    Ok(Channel::Relaxation { t1, t2, time })
}

fn over_rotation(call: &ChannelCall) -> Result<Channel, Diagnostic> {
    let [axis, angle] = bind(call, ["axis", "angle"], 2)?;
    let (Some(axis), Some(angle)) = (axis, angle) else {
        return Err(missing(call));
    };
    let pauli = match &axis.value {
        ChannelValue::Word(word) if word == "x" => Pauli::X,
        ChannelValue::Word(word) if word == "y" => Pauli::Y,
        ChannelValue::Word(word) if word == "z" => Pauli::Z,
        _ => return Err(expected(call, axis, "an axis, one of x, y and z")),
    };
    match angle.value {
        ChannelValue::Number(radians) if radians.is_finite() => {
            Ok(Channel::OverRotation(pauli, radians))
        }
        _ => Err(expected(call, angle, "an angle in radians")),
    }
}

fn readout_flip(call: &ChannelCall) -> Result<Channel, Diagnostic> {
    let by_name =
        |argument: &ChannelArgument| matches!(argument.name.as_deref(), Some("p01") | Some("p10"));
    let flip = if call.arguments.len() > 1 || call.arguments.iter().any(by_name) {
        let [p01, p10] = bind(call, ["p01", "p10"], 2)?;
        ReadoutFlip {
            zero_to_one: probability(call, p01)?,
            one_to_zero: probability(call, p10)?,
        }
    } else {
        let p = only_probability(call, "p")?;
        ReadoutFlip {
            zero_to_one: p,
            one_to_zero: p,
        }
    };
    Ok(Channel::ReadoutFlip(flip))
}

fn pauli(call: &ChannelCall) -> Result<Channel, Diagnostic> {
    let mut words: Vec<(Vec<Pauli>, f64)> = Vec::with_capacity(call.arguments.len());
    let mut seen = std::collections::HashSet::new();
    let mut sum = 0.0;
    for argument in &call.arguments {
        let Some(name) = &argument.name else {
            let message = format!(
                "expected a Pauli word and its probability, found {}",
                kind_of(&argument.value)
            );
            return Err(Diagnostic::error(argument.span, message).with_help(form(call)));
        };
        let word = letters(name, argument)?;
        if let Some((first, _)) = words.first()
            && first.len() != word.len()
        {
            let message = format!(
                "`{name}` has {} letters, the first word has {}",
                word.len(),
                first.len()
            );
            return Err(Diagnostic::error(argument.span, message)
                .with_help("give every word one letter a qubit, I where nothing happens"));
        }
        if !seen.insert(name.as_str()) {
            let message = format!("`{name}` is listed twice");
            return Err(
                Diagnostic::error(argument.span, message).with_help("add the two probabilities")
            );
        }
        let p = probability(call, Some(argument))?;
        sum += p;
        words.push((word, p));
    }
    let Some((first, _)) = words.first() else {
        return Err(
            Diagnostic::error(call.span, "`pauli` lists no Pauli word").with_help(form(call))
        );
    };
    if sum > 1.0 + SUM_SLACK {
        let message = format!("the probabilities of `pauli` sum to {sum}, expected at most 1");
        return Err(Diagnostic::error(call.span, message)
            .with_help("what is left to 1 is the probability that nothing happens"));
    }
    Ok(Channel::Words {
        length: first.len(),
        words,
    })
}

fn letters(name: &str, argument: &ChannelArgument) -> Result<Vec<Pauli>, Diagnostic> {
    if name.len() > LONGEST_WORD {
        let message = format!(
            "a Pauli word of {} letters, at most {LONGEST_WORD} are possible",
            name.len()
        );
        return Err(Diagnostic::error(argument.span, message)
            .with_help("split the channel into channels on fewer qubits"));
    }
    name.chars()
        .map(|letter| match letter {
            'I' => Ok(Pauli::I),
            'X' => Ok(Pauli::X),
            'Y' => Ok(Pauli::Y),
            'Z' => Ok(Pauli::Z),
            _ => {
                let message = format!("`{name}` is no Pauli word");
                Err(Diagnostic::error(argument.span, message)
                    .with_help("a Pauli word is made of the capital letters I, X, Y and Z"))
            }
        })
        .collect()
}
