//! The noise file: TOML text into judged rules.
//!
//! ```toml
//! title = "bench B, cool-down 4"
//!
//! [[rule]]
//! on = ["t", "tdg"]
//! channel = "dephasing(0.01)"
//! place = "after"
//! qubits = [0, "q[3]"]
//! ```
//!
//! Every problem of the file is reported at once, each with its place. What
//! depends on the circuit (which gates it defines, how many qubits it has) is
//! judged when the rules meet it.

use std::sync::Arc;

use toml::Spanned;
use toml::de::{DeTable, DeValue};

use crate::circuit::{Diagnostic, Span, parse_channel};

use super::channels::Channel;
use super::suggest::nearest;

/// A noise file, read and judged.
#[derive(Debug, Clone)]
pub struct NoiseFile {
    /// The `title` of the file, if it has one.
    pub title: Option<String>,
    /// The full text the file was read from.
    pub source: Arc<str>,
    /// The rules in file order.
    pub(super) rules: Vec<Rule>,
}

/// One `[[rule]]`.
#[derive(Debug, Clone)]
pub(super) struct Rule {
    /// What the rule is on.
    pub on: Vec<Target>,
    /// What it does.
    pub channel: Channel,
    /// The text of the channel.
    pub channel_span: Span,
    /// Whether it acts before or after the statement.
    pub place: Place,
    /// The only qubits it is for; all if absent.
    pub qubits: Option<Vec<(QubitName, Span)>>,
    /// The text of `on`.
    pub on_span: Span,
}

/// On which side of a statement a channel acts.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(super) enum Place {
    /// Right before it.
    Before,
    /// Right after it.
    After,
}

/// One entry of `on`.
#[derive(Debug, Clone, PartialEq, Eq, Hash)]
pub(super) enum Target {
    /// Calls of this name, a gate of the library or of the circuit.
    Gate(String),
    /// Library gates on this many qubits.
    Group(usize),
    /// Measurements.
    Measure,
    /// Resets.
    Reset,
    /// Delays.
    Delay,
}

/// One entry of `qubits`.
#[derive(Debug, Clone, PartialEq, Eq)]
pub(super) enum QubitName {
    /// By index, in order of declaration.
    Index(u32),
    /// By name, `q[3]` or `q`.
    Name(String),
}

const TOP_KEYS: [&str; 2] = ["title", "rule"];
const RULE_KEYS: [&str; 4] = ["on", "channel", "place", "qubits"];

impl NoiseFile {
    /// Reads a noise file.
    ///
    /// # Errors
    /// Everything that is wrong with the text itself, in text order: TOML
    /// syntax, unknown keys, unknown channels, wrong types, numbers out of
    /// range, channels that cannot act where `on` puts them.
    pub fn parse(text: &str) -> Result<NoiseFile, Vec<Diagnostic>> {
        let mut reader = Reader {
            text,
            problems: Vec::new(),
        };
        let file = reader.file();
        let mut problems = reader.problems;
        if problems.is_empty() {
            return Ok(file);
        }
        problems.sort_by_key(|problem| problem.span.map_or(0, |span| span.start));
        Err(problems)
    }
}

fn span_of<T>(value: &Spanned<T>) -> Span {
    let range = value.span();
    Span::new(range.start, range.end)
}

struct Reader<'a> {
    text: &'a str,
    problems: Vec<Diagnostic>,
}

impl<'a> Reader<'a> {
    fn problem(&mut self, span: Span, message: impl Into<String>, help: impl Into<String>) {
        let problem = Diagnostic::error(span, message).with_help(help);
        self.problems.push(problem.in_noise_file());
    }

    fn wrong_type(&mut self, value: &Spanned<DeValue<'a>>, key: &str, expected: &str, help: &str) {
        let message = format!(
            "`{key}` is {}, expected {expected}",
            type_name(value.get_ref())
        );
        self.problem(span_of(value), message, help);
    }

    fn file(&mut self) -> NoiseFile {
        let (document, errors) = DeTable::parse_recoverable(self.text);
        let mut file = NoiseFile {
            title: None,
            source: self.text.into(),
            rules: Vec::new(),
        };
        if !errors.is_empty() {
            for error in errors {
                let range = error.span().unwrap_or(0..0);
                let message = error.message();
                self.problem(
                    Span::new(range.start, range.end),
                    format!("not valid TOML: {message}"),
                    "a noise file is TOML: key = value lines under [[rule]] headings",
                );
            }
            return file;
        }
        for (key, value) in document.get_ref() {
            match key.get_ref().as_ref() {
                "title" => match value.get_ref() {
                    DeValue::String(title) => file.title = Some(title.to_string()),
                    _ => self.wrong_type(value, "title", "a string", "write title = \"…\""),
                },
                "rule" => file.rules = self.rules(value),
                other => self.unknown_key(key, other, &TOP_KEYS, "a noise file"),
            }
        }
        file
    }

    fn unknown_key<T>(&mut self, key: &Spanned<T>, name: &str, known: &[&str], place: &str) {
        let help = match nearest(name, known.iter().copied()) {
            Some(word) => format!("did you mean `{word}`?"),
            None => format!("the keys of {place} are {}", known.join(", ")),
        };
        self.problem(span_of(key), format!("unknown key `{name}`"), help);
    }

    fn rules(&mut self, value: &Spanned<DeValue<'a>>) -> Vec<Rule> {
        const HELP: &str = "start every rule with a line [[rule]]";
        let DeValue::Array(entries) = value.get_ref() else {
            self.wrong_type(value, "rule", "a list of rules", HELP);
            return Vec::new();
        };
        let mut rules = Vec::with_capacity(entries.len());
        for entry in entries.iter() {
            match entry.get_ref() {
                DeValue::Table(table) => rules.extend(self.rule(entry, table)),
                _ => self.wrong_type(entry, "rule", "a list of tables", HELP),
            }
        }
        rules
    }

    fn rule(&mut self, whole: &Spanned<DeValue<'a>>, table: &DeTable<'a>) -> Option<Rule> {
        let (mut on, mut channel, mut place, mut qubits) = (None, None, Some(Place::After), None);
        let mut given = [false; 2];
        let mut filter_failed = false;
        for (key, value) in table {
            match key.get_ref().as_ref() {
                "on" => {
                    given[0] = true;
                    on = self.targets(value).map(|on| (on, span_of(value)));
                }
                "channel" => {
                    given[1] = true;
                    channel = self.channel(value);
                }
                "place" => place = self.place(value),
                "qubits" => {
                    qubits = self.qubits(value);
                    filter_failed = qubits.is_none();
                }
                other => self.unknown_key(key, other, &RULE_KEYS, "a rule"),
            }
        }
        for (key, example, given) in [
            ("on", "on = [\"t\", \"measure\"]", given[0]),
            ("channel", "channel = \"dephasing(0.01)\"", given[1]),
        ] {
            if !given {
                self.problem(
                    span_of(whole),
                    format!("this rule has no `{key}`"),
                    format!("add a line such as {example}"),
                );
            }
        }
        let ((on, on_span), (channel, channel_span), place) = (on?, channel?, place?);
        if filter_failed {
            return None;
        }
        let rule = Rule {
            on,
            channel,
            channel_span,
            place,
            qubits,
            on_span,
        };
        self.fits(&rule);
        Some(rule)
    }

    /// Channels that need one kind of statement stand on it alone.
    fn fits(&mut self, rule: &Rule) {
        let only = |target: Target| rule.on.iter().all(|entry| *entry == target);
        match rule.channel {
            Channel::ReadoutFlip(_) if !only(Target::Measure) => self.problem(
                rule.channel_span,
                "readout-flip is about recorded bits, so it goes on `measure` only",
                "write on = [\"measure\"]",
            ),
            Channel::ReadoutFlip(_) if rule.place == Place::Before => self.problem(
                rule.channel_span,
                "readout-flip acts on the recorded bit, it cannot come before the measurement",
                "leave `place` out",
            ),
            Channel::Relaxation { time: None, .. } if !only(Target::Delay) => self.problem(
                rule.channel_span,
                "relaxation(t1, t2) takes its time from a delay, so it goes on `delay` only",
                "write relaxation(t1, t2, time) with the time the statement takes",
            ),
            _ => {}
        }
    }

    fn targets(&mut self, value: &Spanned<DeValue<'a>>) -> Option<Vec<Target>> {
        const EXPECTED: &str = "a list of gate names, groups, or measure, reset, delay";
        const HELP: &str = "write for example on = [\"t\", \"measure\"] or on = [\"two-qubit\"]";
        let DeValue::Array(entries) = value.get_ref() else {
            self.wrong_type(value, "on", EXPECTED, HELP);
            return None;
        };
        if entries.is_empty() {
            self.problem(span_of(value), "`on` is empty", HELP);
            return None;
        }
        let mut targets = Vec::with_capacity(entries.len());
        for entry in entries.iter() {
            match entry.get_ref() {
                DeValue::String(name) => targets.push(target(name)),
                _ => self.wrong_type(entry, "on", EXPECTED, HELP),
            }
        }
        (targets.len() == entries.len()).then_some(targets)
    }

    fn channel(&mut self, value: &Spanned<DeValue<'a>>) -> Option<(Channel, Span)> {
        let DeValue::String(written) = value.get_ref() else {
            let help = "write for example channel = \"dephasing(0.01)\"";
            self.wrong_type(value, "channel", "a string", help);
            return None;
        };
        let whole = span_of(value);
        match parse_channel(written).and_then(|call| Channel::judge(&call)) {
            Ok(channel) => Some((channel, whole)),
            Err(problem) => {
                let span = problem.span.map(|span| self.within(whole, written, span));
                self.problems.push(
                    Diagnostic {
                        span: span.or(Some(whole)),
                        ..problem
                    }
                    .in_noise_file(),
                );
                None
            }
        }
    }

    /// The place in the file of `inner`, a place in the string value `written`.
    /// A string with escapes has no simple inner places; it is named whole.
    fn within(&self, whole: Span, written: &str, inner: Span) -> Span {
        let raw = self.text.get(whole.start as usize..whole.end as usize);
        let quote = raw.and_then(|raw| raw.find(written));
        match (raw, quote) {
            (Some(raw), Some(quote)) if raw.len() == written.len() + 2 * quote => {
                let start = whole.start as usize + quote;
                Span::new(start + inner.start as usize, start + inner.end as usize)
            }
            _ => whole,
        }
    }

    fn place(&mut self, value: &Spanned<DeValue<'a>>) -> Option<Place> {
        const HELP: &str = "write place = \"before\" or place = \"after\"";
        match value.get_ref() {
            DeValue::String(word) if word == "after" => Some(Place::After),
            DeValue::String(word) if word == "before" => Some(Place::Before),
            DeValue::String(word) => {
                let message = format!("`place` is \"{word}\", expected \"before\" or \"after\"");
                self.problem(span_of(value), message, HELP);
                None
            }
            _ => {
                self.wrong_type(value, "place", "\"before\" or \"after\"", HELP);
                None
            }
        }
    }

    fn qubits(&mut self, value: &Spanned<DeValue<'a>>) -> Option<Vec<(QubitName, Span)>> {
        const EXPECTED: &str = "a list of qubit indices or names";
        const HELP: &str = "write for example qubits = [0, 3] or qubits = [\"q[3]\"]";
        let DeValue::Array(entries) = value.get_ref() else {
            self.wrong_type(value, "qubits", EXPECTED, HELP);
            return None;
        };
        let mut names = Vec::with_capacity(entries.len());
        for entry in entries.iter() {
            let span = span_of(entry);
            match entry.get_ref() {
                DeValue::String(name) => names.push((QubitName::Name(name.to_string()), span)),
                DeValue::Integer(digits) => {
                    match u32::from_str_radix(digits.as_str(), digits.radix()) {
                        Ok(index) => names.push((QubitName::Index(index), span)),
                        Err(_) => {
                            let message = format!("{digits} is no qubit index");
                            self.problem(span, message, "indices count from 0");
                        }
                    }
                }
                _ => self.wrong_type(entry, "qubits", EXPECTED, HELP),
            }
        }
        (names.len() == entries.len()).then_some(names)
    }
}

fn type_name(value: &DeValue<'_>) -> &'static str {
    match value {
        DeValue::String(_) => "a string",
        DeValue::Integer(_) => "an integer",
        DeValue::Float(_) => "a float",
        DeValue::Boolean(_) => "a Boolean",
        DeValue::Datetime(_) => "a date or time",
        DeValue::Array(_) => "a list",
        DeValue::Table(_) => "a table",
    }
}

fn target(name: &str) -> Target {
    match name {
        "measure" => Target::Measure,
        "reset" => Target::Reset,
        "delay" => Target::Delay,
        "one-qubit" => Target::Group(1),
        "two-qubit" => Target::Group(2),
        "three-qubit" => Target::Group(3),
        _ => Target::Gate(name.to_string()),
    }
}
