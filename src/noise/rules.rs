//! The rules of the noise file, met with a circuit: which of them are about
//! which statement, and which never were.

use std::collections::HashMap;
use std::rc::Rc;

use crate::circuit::{Action, Circuit, Diagnostic, Gate, Span};

use super::attach::Messages;
use super::channels::Channel;
use super::file::{NoiseFile, Place, QubitName, Rule, Target};
use super::suggest::nearest;

/// What of a statement a rule may be about.
#[derive(Clone, Copy)]
pub(super) enum Statement<'a> {
    /// A call of a library gate.
    Library(Gate),
    /// A call of a gate defined in the circuit.
    Defined(&'a str),
    /// A measurement.
    Measure,
    /// A reset.
    Reset,
    /// A delay.
    Delay,
}

impl<'a> Statement<'a> {
    /// The statement of an action; `None` if no rule can be about it.
    pub(super) fn of(action: &'a Action) -> Option<Self> {
        match action {
            Action::Gate { gate, .. } => Some(Statement::Library(*gate)),
            Action::Call { name, .. } => Some(Statement::Defined(name)),
            Action::Measure { .. } => Some(Statement::Measure),
            Action::Reset { .. } => Some(Statement::Reset),
            Action::Delay { .. } => Some(Statement::Delay),
            Action::Barrier { .. } | Action::Assign { .. } => None,
        }
    }
}

/// The rules and what became of them.
pub(super) struct Rules<'a> {
    rules: &'a [Rule],
    states: Vec<State>,
    library: HashMap<Gate, Rc<[usize]>>,
    defined: HashMap<String, Rc<[usize]>>,
    measure: Rc<[usize]>,
    reset: Rc<[usize]>,
    delay: Rc<[usize]>,
}

struct State {
    /// For every qubit whether the rule is for it; all if absent.
    filter: Option<Vec<bool>>,
    matched: bool,
    disabled: bool,
}

impl<'a> Rules<'a> {
    /// Looks up the qubits the rules name. Tells what the circuit has not.
    pub(super) fn new(
        circuit: &Circuit,
        file: Option<&'a NoiseFile>,
        messages: &mut Messages,
    ) -> Self {
        let rules = file.map_or(&[][..], |file| &file.rules);
        let states = rules.iter().map(|rule| State {
            filter: rule
                .qubits
                .as_ref()
                .map(|names| filter(circuit, names, messages)),
            matched: false,
            disabled: false,
        });
        let states = states.collect();
        let on = |target: &Target| about(rules, |entry| entry == target);
        Rules {
            rules,
            states,
            library: HashMap::new(),
            defined: HashMap::new(),
            measure: on(&Target::Measure),
            reset: on(&Target::Reset),
            delay: on(&Target::Delay),
        }
    }

    /// The rules about a statement, whatever its qubits, in file order.
    pub(super) fn matching(&mut self, statement: Statement<'_>) -> Rc<[usize]> {
        let rules = self.rules;
        match statement {
            Statement::Measure => self.measure.clone(),
            Statement::Reset => self.reset.clone(),
            Statement::Delay => self.delay.clone(),
            Statement::Library(gate) => self
                .library
                .entry(gate)
                .or_insert_with(|| {
                    about(rules, |entry| match entry {
                        Target::Gate(name) => name == gate.name(),
                        Target::Group(qubits) => *qubits == gate.qubits(),
                        _ => false,
                    })
                })
                .clone(),
            Statement::Defined(called) => match self.defined.get(called) {
                Some(list) => list.clone(),
                None => {
                    let list = about(
                        rules,
                        |entry| matches!(entry, Target::Gate(name) if name == called),
                    );
                    self.defined.insert(called.to_string(), list.clone());
                    list
                }
            },
        }
    }

    /// Whether a matching rule is for these qubits too. Notes that it was used.
    pub(super) fn applies(&mut self, index: usize, qubits: &[u32]) -> bool {
        let state = &mut self.states[index];
        let listed = |qubit: &u32| match &state.filter {
            None => true,
            Some(filter) => filter.get(*qubit as usize).copied().unwrap_or(false),
        };
        if !qubits.iter().all(listed) {
            return false;
        }
        state.matched = true;
        !state.disabled
    }

    /// Which side a rule acts on.
    pub(super) fn place(&self, index: usize) -> Place {
        self.rules[index].place
    }

    /// What a rule does, and where that is written.
    pub(super) fn channel(&self, index: usize) -> (&'a Channel, Span) {
        let rule = &self.rules[index];
        (&rule.channel, rule.channel_span)
    }

    /// Takes a rule that cannot work out of use, so that it is told of once.
    pub(super) fn disable(&mut self, index: usize) {
        self.states[index].disabled = true;
    }

    /// Warns of rules that never matched.
    pub(super) fn warn_of_idle(&self, messages: &mut Messages) {
        for (rule, state) in self.rules.iter().zip(&self.states) {
            if !state.matched {
                let warning = Diagnostic::warning(rule.on_span, "this rule never matched");
                messages.tell(warning.with_help(self.why_idle(rule)).in_noise_file());
            }
        }
    }

    fn why_idle(&self, rule: &Rule) -> String {
        let called: Vec<&str> = self
            .library
            .keys()
            .map(|gate| gate.name())
            .chain(self.defined.keys().map(String::as_str))
            .collect();
        for entry in &rule.on {
            if let Target::Gate(name) = entry
                && !called.contains(&name.as_str())
            {
                let known = ["one-qubit", "two-qubit", "three-qubit"];
                let known = known.into_iter().chain(["measure", "reset", "delay"]);
                return match nearest(name, called.iter().copied().chain(known)) {
                    Some(word) => {
                        format!("the circuit calls no gate `{name}`; did you mean `{word}`?")
                    }
                    None => format!("the circuit calls no gate `{name}`"),
                };
            }
        }
        match rule.qubits {
            Some(_) => "no such statement acts on the listed qubits alone".into(),
            None => "the circuit has no such statement".into(),
        }
    }
}

fn about(rules: &[Rule], matches: impl Fn(&Target) -> bool) -> Rc<[usize]> {
    (0..rules.len())
        .filter(|&index| rules[index].on.iter().any(&matches))
        .collect()
}

fn filter(circuit: &Circuit, names: &[(QubitName, Span)], messages: &mut Messages) -> Vec<bool> {
    let mut listed = vec![false; circuit.qubits.len()];
    for (name, span) in names {
        let index = match name {
            QubitName::Index(index) => Some(*index as usize),
            QubitName::Name(name) => circuit.qubits.iter().position(|qubit| qubit == name),
        };
        match index.and_then(|index| listed.get_mut(index)) {
            Some(entry) => *entry = true,
            None => {
                let name = match name {
                    QubitName::Index(index) => index.to_string(),
                    QubitName::Name(name) => format!("\"{name}\""),
                };
                let message = format!("the circuit has no qubit {name}");
                let help = match (circuit.qubits.first(), circuit.qubits.last()) {
                    (Some(first), Some(last)) => format!(
                        "it has qubits 0 to {}, named \"{first}\" to \"{last}\"",
                        circuit.qubits.len() - 1
                    ),
                    _ => "it has no qubits at all".into(),
                };
                messages.tell(
                    Diagnostic::error(*span, message)
                        .with_help(help)
                        .in_noise_file(),
                );
            }
        }
    }
    listed
}
