//! Gate calls: modifiers, broadcast, library gates and gates of the file.
//!
//! `inv` and `ctrl` turn a library gate into another one where the library has
//! it; on a gate of the file they go to every statement of its body. `pow`
//! repeats the call. `negctrl` turns over controls of the library gate it leads
//! to, which stays one call. A global phase without a control leaves no
//! operation.

use std::rc::Rc;

use smallvec::{SmallVec, smallvec};

use super::definition::Definition;
use super::evaluate::Division;
use super::scope::{Entity, Frame, Kind};
use super::{Failure, Lowered, Lowering};
use crate::circuit::ast::{Annotation, Call, ModifierKind, Name, Statement};
use crate::circuit::diagnostic::{Diagnostic, Span};
use crate::circuit::{Action, AnnotatedNoise, Edge, Gate, Qubits};

type Parameters = SmallVec<[f64; 4]>;
type Noise = Option<Box<AnnotatedNoise>>;

/// What is called.
#[derive(Debug, Clone)]
pub enum Target<'a> {
    /// A library gate.
    Library(Gate),
    /// A gate of the file.
    Defined(Rc<Definition<'a>>),
}

/// Modifiers taken together; they commute.
#[derive(Debug, Clone)]
struct Modified {
    inverse: bool,
    repeat: u64,
    /// For each control, in the order of the operands, whether it acts on 0.
    controls: SmallVec<[bool; 2]>,
}

/// A call on given qubits.
struct Instance<'a> {
    target: Target<'a>,
    parameters: Parameters,
    inverse: bool,
    repeat: u64,
    controls: SmallVec<[(u32, bool); 2]>,
    /// Qubits without the controls.
    qubits: Qubits,
    span: Span,
}

impl<'a> Lowering<'a> {
    /// `ctrl @ inv @ g(0.1) a, b;`
    pub(super) fn call(
        &mut self,
        call: &Call<'a>,
        annotations: &[Annotation<'a>],
        span: Span,
    ) -> Lowered<()> {
        let target = self.target(call.gate)?;
        let modified = self.modified(call)?;
        let controls = modified.controls.len();
        self.check_counts(&target, call, controls, span)?;
        if let Target::Defined(definition) = &target
            && definition.noisy
            && controls > 0
        {
            return Err(noisy_control(&definition.name, span).into());
        }
        let mut parameters = Parameters::new();
        for parameter in &call.parameters {
            parameters.push(self.number(parameter, Division::Integer, "an angle")?);
        }
        let noise = self.noise(annotations)?;
        let mut operands = SmallVec::<[_; 4]>::new();
        for operand in &call.operands {
            operands.push(self.select(operand, Kind::Qubits)?);
        }
        let count = self.broadcast(&operands, span)?;
        for instance in 0..count {
            let qubits: Qubits = operands
                .iter()
                .map(|operand| operand.items[if operand.single { 0 } else { instance }])
                .collect();
            self.budget.step(qubits.len() as u64, span)?;
            if self.frame.is_none() {
                self.refuse_repeated(&qubits, span)?;
            }
            let controlling = qubits
                .iter()
                .copied()
                .zip(modified.controls.iter().copied());
            let mut all_controls = SmallVec::<[(u32, bool); 2]>::new();
            let mut inverse = modified.inverse;
            if let Some(frame) = &self.frame {
                all_controls.extend(frame.controls.iter().copied());
                inverse ^= frame.inverse;
            }
            all_controls.extend(controlling);
            self.run(
                &Instance {
                    target: target.clone(),
                    parameters: parameters.clone(),
                    inverse,
                    repeat: modified.repeat,
                    controls: all_controls,
                    qubits: qubits[controls..].iter().copied().collect(),
                    span,
                },
                noise.clone(),
            )?;
        }
        Ok(())
    }

    /// The gate of a name.
    pub(super) fn target(&mut self, name: Name<'a>) -> Lowered<Target<'a>> {
        // Names of angles and qubits do not hide gates.
        if let Some(Entity::Gate(index)) = self.find_global(name.text, name.span)? {
            return Ok(Target::Defined(Rc::clone(&self.definitions[index])));
        }
        if let Some(gate) = Gate::from_name(name.text) {
            return Ok(Target::Library(gate));
        }
        match self.find(name.text, name.span)? {
            Some(Entity::Unknown) => Err(Failure::Silent),
            Some(entity) => Err(Diagnostic::error(
                name.span,
                format!("`{}` is {} and not a gate", name.text, entity.kind()),
            )
            .into()),
            None if self.doubtful.contains(name.text) => Err(Failure::Silent),
            None => {
                let error =
                    Diagnostic::error(name.span, format!("there is no gate `{}`", name.text));
                let gates = super::suggest::gate_names();
                let defined = self.definitions.iter().map(|defined| &*defined.name);
                Err(
                    match super::suggest::nearest(name.text, gates.chain(defined)) {
                        Some(similar) => error.with_help(format!("did you mean `{similar}`?")),
                        None => error.with_help("define it with `gate` before its first call"),
                    }
                    .into(),
                )
            }
        }
    }

    fn modified(&mut self, call: &Call<'a>) -> Lowered<Modified> {
        let mut modified = Modified {
            inverse: false,
            repeat: 1,
            controls: smallvec![],
        };
        for modifier in &call.modifiers {
            self.budget.step(1, modifier.span)?;
            match &modifier.kind {
                ModifierKind::Inverse => modified.inverse = !modified.inverse,
                ModifierKind::Power(exponent) => {
                    let value = self.evaluate(exponent, Division::Exact)?;
                    let Some(power) = value.integer() else {
                        return Err(Diagnostic::error(
                            exponent.span,
                            format!("`pow` takes a constant integer, found {}", value.kind()),
                        )
                        .with_help("roots of gates are not supported; `sx` is the root of `x`")
                        .into());
                    };
                    modified.inverse ^= power < 0;
                    let times = u64::try_from(power.unsigned_abs()).ok();
                    modified.repeat = times
                        .and_then(|times| modified.repeat.checked_mul(times))
                        .ok_or_else(|| {
                            Diagnostic::error(exponent.span, "this power is too large")
                        })?;
                }
                ModifierKind::Control { negated, count } => {
                    let count = match count {
                        Some(count) => self.size(count, "the number of controls")?,
                        None => 1,
                    };
                    if modified.controls.len().saturating_add(count) > call.operands.len() {
                        return Err(Diagnostic::error(
                            modifier.span,
                            format!(
                                "more controls than the {} qubits of the call",
                                call.operands.len()
                            ),
                        )
                        .with_help("controls come first, one qubit each")
                        .into());
                    }
                    modified
                        .controls
                        .extend(std::iter::repeat_n(*negated, count));
                }
            }
        }
        Ok(modified)
    }

    /// Refuses a call with too many or too few angles or qubits.
    pub(super) fn check_counts(
        &self,
        target: &Target<'a>,
        call: &Call<'a>,
        controls: usize,
        span: Span,
    ) -> Lowered<()> {
        let (parameters, qubits) = match target {
            Target::Library(gate) => (gate.parameters(), gate.qubits()),
            Target::Defined(definition) => (definition.parameters, definition.qubits),
        };
        let s = |count: usize| if count == 1 { "" } else { "s" };
        let name = call.gate.text;
        let found = call.parameters.len();
        if found != parameters {
            return Err(Diagnostic::error(
                span,
                format!(
                    "`{name}` takes {parameters} angle{}, found {found}",
                    s(parameters)
                ),
            )
            .into());
        }
        let found = call.operands.len();
        let wanted = qubits.saturating_add(controls);
        if found != wanted {
            let with = match controls {
                0 => String::new(),
                1 => " with 1 control".to_owned(),
                more => format!(" with {more} controls"),
            };
            return Err(Diagnostic::error(
                span,
                format!(
                    "`{name}`{with} takes {wanted} qubit{}, found {found}",
                    s(wanted)
                ),
            )
            .into());
        }
        Ok(())
    }

    /// How many calls the operands make.
    fn broadcast(&self, operands: &[super::select::Selected], span: Span) -> Lowered<usize> {
        let mut registers = operands.iter().filter(|operand| !operand.single);
        let Some(first) = registers.next() else {
            return Ok(1);
        };
        let count = first.items.len();
        match registers.find(|operand| operand.items.len() != count) {
            None => Ok(count),
            Some(other) => Err(Diagnostic::error(
                span,
                format!(
                    "registers of {count} and {} qubits in one call",
                    other.items.len()
                ),
            )
            .with_help("registers in one call must have the same length")
            .into()),
        }
    }

    /// Writes the calls of an instance. Noise before goes on the first, noise
    /// after on the last.
    fn run(&mut self, instance: &Instance<'a>, noise: Noise) -> Lowered<()> {
        let span = instance.span;
        self.budget.step(1, span)?;
        if instance.repeat == 0 {
            let Some(noise) = noise else {
                return Ok(());
            };
            let controls = instance.controls.iter().map(|control| control.0);
            let qubits: Qubits = controls.chain(instance.qubits.iter().copied()).collect();
            if qubits.is_empty() {
                return Err(noise_on_nothing(span).into());
            }
            return self.emit(Action::Barrier { qubits }, Some(noise), span);
        }
        let (before, after) = split(noise);
        match &instance.target {
            Target::Library(gate) => self.run_library(*gate, instance, before, after),
            Target::Defined(definition) => {
                let outcome = self.run_defined(definition, instance, before, after);
                match outcome {
                    Err(Failure::Error(mut error)) if self.frame.is_none() => {
                        let (line, _) = span.line_and_column(self.source);
                        let name = &definition.name;
                        let place = format!("this is in the call of `{name}` on line {line}");
                        error.help = Some(match error.help {
                            Some(help) => format!("{help}; {place}"),
                            None => place,
                        });
                        Err(error.into())
                    }
                    outcome => outcome,
                }
            }
        }
    }

    fn run_library(
        &mut self,
        gate: Gate,
        instance: &Instance<'a>,
        mut before: Noise,
        mut after: Noise,
    ) -> Lowered<()> {
        let span = instance.span;
        let (gate, parameters) = library_call(gate, instance)?;
        if gate == Gate::GlobalPhase {
            return match before.or(after) {
                Some(_) => Err(noise_on_nothing(span).into()),
                None => Ok(()),
            };
        }
        let controls = instance.controls.iter().map(|control| control.0);
        let qubits: Qubits = controls.chain(instance.qubits.iter().copied()).collect();
        for pass in 1..=instance.repeat {
            let noise = if pass < instance.repeat {
                before.take()
            } else {
                together(before.take(), after.take())
            };
            let action = Action::Gate {
                gate,
                parameters: parameters.clone(),
                qubits: qubits.clone(),
            };
            self.emit(action, noise, span)?;
        }
        Ok(())
    }

    fn run_defined(
        &mut self,
        definition: &Rc<Definition<'a>>,
        instance: &Instance<'a>,
        mut before: Noise,
        mut after: Noise,
    ) -> Lowered<()> {
        let controls = instance.controls.iter().map(|control| control.0);
        let qubits: Qubits = controls.chain(instance.qubits.iter().copied()).collect();
        for pass in 1..=instance.repeat {
            let edge = |edge| Action::Call {
                name: definition.name.clone(),
                qubits: qubits.clone(),
                edge,
            };
            self.emit(edge(Edge::Start), before.take(), instance.span)?;
            let scopes = self.scopes.len();
            let around = self.frame.replace(Frame {
                definition: Rc::clone(definition),
                parameters: instance.parameters.clone(),
                qubits: instance.qubits.clone(),
                controls: instance.controls.clone(),
                inverse: instance.inverse,
                base: scopes,
            });
            let outcome = self.deeper(instance.span, |lowering| {
                lowering.run_body(&definition.body)
            });
            self.frame = around;
            self.close_scopes(scopes);
            outcome?;
            let noise = if pass == instance.repeat {
                after.take()
            } else {
                None
            };
            self.emit(edge(Edge::End), noise, instance.span)?;
        }
        Ok(())
    }

    /// Runs statements of a gate body, backwards for an inverse.
    pub(super) fn run_body(&mut self, statements: &[Statement<'a>]) -> Lowered<()> {
        if self.frame.as_ref().is_some_and(|frame| frame.inverse) {
            statements
                .iter()
                .rev()
                .try_for_each(|statement| self.statement(statement))
        } else {
            statements
                .iter()
                .try_for_each(|statement| self.statement(statement))
        }
    }
}

/// The library gate that a modified one comes to.
fn library_call(gate: Gate, instance: &Instance<'_>) -> Lowered<(Gate, Parameters)> {
    let (mut current, mut parameters) = if instance.inverse {
        gate.inverse(&instance.parameters)
    } else {
        (gate, instance.parameters.clone())
    };
    let mut mask = 0u8;
    for (position, (_, negated)) in instance.controls.iter().enumerate() {
        (current, parameters) = current
            .controlled(&parameters)
            .ok_or_else(|| no_controlled(gate, instance.controls.len(), instance.span))?;
        mask |= u8::from(*negated) << position;
    }
    if parameters.iter().any(|angle| !angle.is_finite()) {
        return Err(
            Diagnostic::error(instance.span, "an angle that is not a finite number").into(),
        );
    }
    Ok((current.with_negated(mask), parameters))
}

/// The error for a library gate without a form with so many controls.
pub(super) fn no_controlled(gate: Gate, controls: usize, span: Span) -> Diagnostic {
    let controls = match controls {
        1 => "a control".to_owned(),
        more => format!("{more} controls"),
    };
    Diagnostic::error(
        span,
        format!(
            "`{}` with {controls} is not a gate of the library",
            gate.name()
        ),
    )
    .with_help("write it with library gates, such as `ccx`, `ccz`, `cp` and `cu`")
}

/// The error for a controlled gate whose body carries noise.
pub(super) fn noisy_control(name: &str, span: Span) -> Diagnostic {
    Diagnostic::error(
        span,
        format!("`ctrl` on `{name}`, whose body carries noise"),
    )
    .with_help("noise cannot be controlled: define a controlled gate and annotate its statements")
}

fn noise_on_nothing(span: Span) -> Diagnostic {
    Diagnostic::error(span, "noise on a statement that acts on no qubit")
}

/// Noise before and noise after, apart.
fn split(noise: Noise) -> (Noise, Noise) {
    let Some(noise) = noise else {
        return (None, None);
    };
    let AnnotatedNoise { before, after } = *noise;
    let boxed = |noise: AnnotatedNoise| {
        (!(noise.before.is_empty() && noise.after.is_empty())).then(|| Box::new(noise))
    };
    (
        boxed(AnnotatedNoise {
            before,
            after: Vec::new(),
        }),
        boxed(AnnotatedNoise {
            before: Vec::new(),
            after,
        }),
    )
}

fn together(before: Noise, after: Noise) -> Noise {
    match (before, after) {
        (Some(mut before), Some(after)) => {
            before.after = after.after;
            Some(before)
        }
        (before, after) => before.or(after),
    }
}
