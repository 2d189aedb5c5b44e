//! Names and what they stand for.

use std::collections::HashMap;
use std::collections::hash_map::Entry;
use std::rc::Rc;

use smallvec::SmallVec;

use super::definition::{Definition, Local};
use super::value::Value;
use super::{Failure, Lowered, Lowering};
use crate::circuit::ast::Name;
use crate::circuit::diagnostic::{Diagnostic, Span};

/// Qubits or bits of the circuit, in order.
#[derive(Debug, Clone)]
pub enum Places {
    /// Neighbours.
    Run {
        /// The first.
        first: u32,
        /// How many.
        count: u32,
    },
    /// Any.
    List(Rc<[u32]>),
}

impl Places {
    /// How many.
    pub fn len(&self) -> usize {
        match self {
            Places::Run { count, .. } => *count as usize,
            Places::List(list) => list.len(),
        }
    }

    /// The one at a position, which must be less than the length.
    pub fn at(&self, position: usize) -> u32 {
        match self {
            Places::Run { first, .. } => first + position as u32,
            Places::List(list) => list[position],
        }
    }
}

/// Qubits or bits.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Kind {
    /// Qubits.
    Qubits,
    /// Bits.
    Bits,
}

/// What a name stands for.
#[derive(Debug, Clone)]
pub enum Entity {
    /// A constant, an input or a loop variable.
    Constant(Value),
    /// A register or a part of one.
    Register {
        /// Of what.
        kind: Kind,
        /// Which.
        places: Places,
        /// Whether it is one qubit or bit and not a register of one.
        single: bool,
    },
    /// A gate of the file, by its index.
    Gate(usize),
    /// Something whose declaration was wrong.
    Unknown,
}

impl Entity {
    /// What it is, in words.
    pub fn kind(&self) -> &'static str {
        match self {
            Entity::Constant(_) => "a constant",
            Entity::Register {
                kind: Kind::Qubits, ..
            } => "made of qubits",
            Entity::Register {
                kind: Kind::Bits, ..
            } => "made of bits",
            Entity::Gate(_) => "a gate",
            Entity::Unknown => "unknown",
        }
    }
}

/// The names of a block.
#[derive(Debug, Default)]
pub struct Scope<'a> {
    names: HashMap<&'a str, (Entity, Span)>,
    /// Bytes of aliases, given back at the end of the block.
    pub bytes: u64,
}

/// The call of a gate of the file whose body is being run.
#[derive(Debug, Clone)]
pub struct Frame<'a> {
    /// The gate.
    pub definition: Rc<Definition<'a>>,
    /// Its angles.
    pub parameters: SmallVec<[f64; 4]>,
    /// Its qubits.
    pub qubits: SmallVec<[u32; 4]>,
    /// Controls on every gate of the body, and whether they act on 0.
    pub controls: SmallVec<[(u32, bool); 2]>,
    /// Whether the body runs backwards, every gate inverted.
    pub inverse: bool,
    /// Index of the first scope that belongs to the body.
    pub base: usize,
}

impl<'a> Lowering<'a> {
    /// What a name stands for at this place, if anything.
    pub(super) fn find(&mut self, name: &str, place: Span) -> Lowered<Option<Entity>> {
        let base = self.frame.as_ref().map_or(1, |frame| frame.base);
        self.budget
            .step(1 + (self.scopes.len() - base) as u64 / 8, place)?;
        for scope in self.scopes[base..].iter().rev() {
            if let Some((entity, _)) = scope.names.get(name) {
                return Ok(Some(entity.clone()));
            }
        }
        if let Some(frame) = &self.frame
            && let Some(local) = frame.definition.names.get(name)
        {
            return Ok(Some(match *local {
                Local::Parameter(index) => {
                    Entity::Constant(Value::Float(frame.parameters[index as usize]))
                }
                Local::Qubit(index) => Entity::Register {
                    kind: Kind::Qubits,
                    places: Places::Run {
                        first: frame.qubits[index as usize],
                        count: 1,
                    },
                    single: true,
                },
            }));
        }
        Ok(self.scopes[0].names.get(name).map(|entry| entry.0.clone()))
    }

    /// What a name stands for, or that it is not declared.
    pub(super) fn lookup(&mut self, name: Name<'a>) -> Lowered<Entity> {
        match self.find(name.text, name.span)? {
            Some(Entity::Unknown) => Err(Failure::Silent),
            Some(Entity::Register { .. })
                if self
                    .frame
                    .as_ref()
                    .is_some_and(|frame| !frame.definition.names.contains_key(name.text)) =>
            {
                Err(Diagnostic::error(
                    name.span,
                    format!("`{}` is not a qubit of this gate", name.text),
                )
                .into())
            }
            Some(entity) => Ok(entity),
            None => Err(self.undeclared(name)),
        }
    }

    /// The failure for a name that is not declared.
    pub(super) fn undeclared(&mut self, name: Name<'a>) -> Failure {
        if self.doubtful.contains(name.text) {
            return Failure::Silent;
        }
        let error = Diagnostic::error(name.span, format!("`{}` is not declared", name.text));
        let gate = crate::circuit::Gate::from_name(name.text).map(|gate| gate.qubits());
        Failure::Error(match (self.similar(name.text), gate) {
            (_, Some(_)) => error.with_help(format!("`{}` is a gate", name.text)),
            (Some(similar), None) => error.with_help(format!("did you mean `{similar}`?")),
            (None, None) => error,
        })
    }

    /// Declares a name in the innermost block.
    pub(super) fn declare(&mut self, name: Name<'a>, entity: Entity) -> Lowered<()> {
        let scope = self.scopes.last_mut().expect("there is a global scope");
        let earlier = match scope.names.entry(name.text) {
            Entry::Vacant(vacant) => {
                vacant.insert((entity, name.span));
                return Ok(());
            }
            Entry::Occupied(mut occupied) => {
                let (before, place) = occupied.get().clone();
                if matches!(before, Entity::Unknown) {
                    occupied.insert((entity, name.span));
                    return Ok(());
                }
                place
            }
        };
        let (line, _) = earlier.line_and_column(self.source);
        Err(
            Diagnostic::error(name.span, format!("`{}` is declared twice", name.text))
                .with_help(format!("it is declared on line {line}; use another name"))
                .into(),
        )
    }

    /// Takes note of a name whose declaration is wrong, so that its uses are
    /// not reported too.
    pub(super) fn declare_unknown(&mut self, name: Name<'a>) {
        if let Some(scope) = self.scopes.last_mut() {
            scope
                .names
                .entry(name.text)
                .or_insert((Entity::Unknown, name.span));
        }
    }

    /// Sets a name of the innermost block, declared or not.
    pub(super) fn set(&mut self, name: Name<'a>, entity: Entity) {
        if let Some(scope) = self.scopes.last_mut() {
            scope.names.insert(name.text, (entity, name.span));
        }
    }

    /// Opens a block.
    pub(super) fn open_scope(&mut self) {
        self.scopes.push(Scope::default());
    }

    /// Closes blocks until `count` are left.
    pub(super) fn close_scopes(&mut self, count: usize) {
        for scope in self.scopes.drain(count..) {
            self.budget.release(scope.bytes);
        }
    }

    /// Names that can be seen here, for suggestions.
    pub(super) fn visible_names(&self) -> impl Iterator<Item = &'a str> {
        let local = self.frame.iter().flat_map(|frame| {
            let names: Vec<&'a str> = frame.definition.names.keys().copied().collect();
            names
        });
        let scoped = self.scopes.iter().flat_map(|scope| scope.names.keys());
        local.chain(scoped.copied())
    }

    /// Whether the statement stands outside of every block and gate.
    pub(super) fn at_top_level(&self) -> bool {
        self.scopes.len() == 1 && self.frame.is_none()
    }
}

impl Scope<'_> {
    /// Whether a name is declared here.
    pub fn holds(&self, name: &str) -> bool {
        self.names.contains_key(name)
    }
}

impl Lowering<'_> {
    /// What a name stands for outside of every block and gate.
    pub(super) fn find_global(&mut self, name: &str, place: Span) -> Lowered<Option<Entity>> {
        self.budget.step(1, place)?;
        Ok(self.scopes[0].names.get(name).map(|entry| entry.0.clone()))
    }
}
