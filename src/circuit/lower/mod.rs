//! From the syntax tree to flat operations: names are looked up, constants
//! evaluated, loops, gate bodies, broadcasts and conditions unrolled.
//!
//! Statements are lowered as they are read. What may be spent is counted in
//! [`budget`]; the nesting of blocks and gate calls is bounded too, so that no
//! input exhausts memory, time or stack.

mod alias;
mod bits;
mod budget;
mod call;
mod classical;
mod control_flow;
mod declare;
mod definition;
mod emit;
mod evaluate;
mod noise;
mod registers;
mod scope;
mod select;
mod statement;
mod suggest;
mod timing;
mod value;

use std::collections::{BTreeMap, HashSet};
use std::rc::Rc;
use std::sync::Arc;

use super::diagnostic::{Diagnostic, Span};
use super::limits::{MAX_ERRORS, MAX_WARNINGS};
use super::{Circuit, Operation, Register};
use budget::Budget;
use definition::Definition;
use scope::{Frame, Scope};

pub use budget::grouped;

/// Why a statement was not lowered.
#[derive(Debug)]
pub enum Failure {
    /// It is wrong.
    Error(Diagnostic),
    /// It needs something that was wrong before and is reported already.
    Silent,
    /// A budget is used up: nothing more can be done.
    Stop(Diagnostic),
}

impl From<Diagnostic> for Failure {
    fn from(error: Diagnostic) -> Self {
        Failure::Error(error)
    }
}

type Lowered<T> = Result<T, Failure>;

/// Marks the number of a hidden bit until the number of declared bits is known.
const HIDDEN: u32 = 1 << 31;

/// The state of lowering a file.
pub struct Lowering<'a> {
    source: &'a str,
    inputs: &'a BTreeMap<String, f64>,
    used_inputs: HashSet<&'a str>,
    version_2: bool,
    included: HashSet<&'static str>,

    /// Names, the global ones first.
    scopes: Vec<Scope<'a>>,
    /// The gate body that is being run.
    frame: Option<Frame<'a>>,
    definitions: Vec<Rc<Definition<'a>>>,
    /// Names in statements that could not be read.
    doubtful: HashSet<&'a str>,
    /// Levels of blocks and gate calls.
    depth: usize,

    qubits: Vec<String>,
    registers: Vec<Register>,
    any_output: bool,
    declared_bits: usize,
    hidden_bits: usize,
    hidden_peak: usize,
    /// The hidden bit that holds the condition around.
    condition: Option<u32>,
    operations: Vec<Operation>,
    budget: Budget,

    errors: Vec<Diagnostic>,
    /// Statements that failed, reported or not.
    failures: usize,
    warnings: Vec<Diagnostic>,
    more_warnings: usize,
    warned: HashSet<Span>,
}

impl<'a> Lowering<'a> {
    /// The state before the first statement.
    pub fn new(source: &'a str, inputs: &'a BTreeMap<String, f64>, max_operations: usize) -> Self {
        Lowering {
            source,
            inputs,
            used_inputs: HashSet::new(),
            version_2: false,
            included: HashSet::new(),
            scopes: vec![Scope::default()],
            frame: None,
            definitions: Vec::new(),
            doubtful: HashSet::new(),
            depth: 0,
            qubits: Vec::new(),
            registers: Vec::new(),
            any_output: false,
            declared_bits: 0,
            hidden_bits: 0,
            hidden_peak: 0,
            condition: None,
            operations: Vec::new(),
            budget: Budget::new(max_operations),
            errors: Vec::new(),
            failures: 0,
            warnings: Vec::new(),
            more_warnings: 0,
            warned: HashSet::new(),
        }
    }

    /// Sets whether the text is OpenQASM 2.
    pub fn set_version_2(&mut self, version_2: bool) {
        self.version_2 = version_2;
    }

    /// Takes note of words in a statement that could not be read, so that a
    /// name it would have declared is not reported again.
    pub fn doubt(&mut self, words: Vec<&'a str>) {
        self.failures += 1;
        self.doubtful.extend(words);
    }

    /// Takes an error. Whether reading can go on.
    pub fn report(&mut self, error: Diagnostic) -> bool {
        self.failures += 1;
        if !self.errors.contains(&error) && self.errors.len() < MAX_ERRORS {
            self.errors.push(error);
        }
        self.errors.len() < MAX_ERRORS
    }

    /// Takes a warning; the same place is warned of once.
    pub fn warn(&mut self, warning: Diagnostic) {
        if let Some(span) = warning.span
            && !self.warned.insert(span)
        {
            return;
        }
        if self.warnings.len() < MAX_WARNINGS {
            self.warnings.push(warning);
        } else {
            self.more_warnings += 1;
        }
    }

    /// Takes what became of a statement. Whether reading can go on.
    fn settle(&mut self, outcome: Lowered<()>) -> bool {
        match outcome {
            Ok(()) => true,
            Err(Failure::Silent) => {
                self.failures += 1;
                true
            }
            Err(Failure::Error(error)) => self.report(error),
            Err(Failure::Stop(error)) => {
                self.report(error);
                false
            }
        }
    }

    /// The circuit, or what is wrong with it; `complete` says whether all of the
    /// text has been read.
    pub fn finish(mut self, name: &str, complete: bool) -> Result<Circuit, Vec<Diagnostic>> {
        if complete {
            self.check_inputs();
        }
        if !self.errors.is_empty() {
            return Err(self.errors);
        }
        self.settle_hidden_bits();
        if self.more_warnings > 0 {
            let more = self.more_warnings;
            self.warnings.push(Diagnostic {
                span: None,
                ..Diagnostic::warning(Span::default(), format!("{more} more warnings"))
            });
        }
        for register in &mut self.registers {
            register.recorded |= !self.any_output;
        }
        Ok(Circuit {
            name: name.to_owned(),
            source: Arc::from(self.source),
            qubits: self.qubits,
            registers: self.registers,
            bits: self.declared_bits + self.hidden_peak,
            operations: self.operations,
            warnings: self.warnings,
        })
    }
}
