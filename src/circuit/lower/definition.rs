//! Gates defined in the file. A body is checked once, at its definition, as far
//! as that is possible without the angles; it is run at every call.

use std::collections::HashMap;
use std::rc::Rc;
use std::sync::Arc;

use super::call::Target;
use super::scope::Entity;
use super::statement::has_noise;
use super::{Lowered, Lowering};
use crate::circuit::Gate;
use crate::circuit::ast::{
    Annotation, AnnotationKind, Call, Expression, For, GateDefinition, Index, IndexKind,
    ModifierKind, Name, NodeKind, Operand, Statement, StatementKind, Values,
};
use crate::circuit::diagnostic::{Diagnostic, Span};
use crate::circuit::limits::MAX_NESTING;

/// A gate of the file.
#[derive(Debug)]
pub struct Definition<'a> {
    /// Its name.
    pub name: Arc<str>,
    /// Its angles and qubits.
    pub names: HashMap<&'a str, Local>,
    /// Number of angles.
    pub parameters: usize,
    /// Number of qubits.
    pub qubits: usize,
    /// What it does.
    pub body: Vec<Statement<'a>>,
    /// Whether its body, or a gate called in it, carries noise.
    pub noisy: bool,
    /// Levels of loops and calls inside.
    pub depth: usize,
}

/// A name in a gate body.
#[derive(Debug, Clone, Copy)]
pub enum Local {
    /// The angle of this index.
    Parameter(u32),
    /// The qubit of this index.
    Qubit(u32),
}

/// Checks a gate body.
struct Check<'l, 'a> {
    lowering: &'l mut Lowering<'a>,
    names: &'l HashMap<&'a str, Local>,
    /// Loop variables in sight.
    variables: Vec<&'a str>,
    noisy: bool,
}

/// Names of the standard library of OpenQASM 3, which a file that includes it
/// cannot define again. Source: the listing in arXiv:2104.14722.
const STANDARD: &[&str] = &[
    "p", "x", "y", "z", "h", "s", "sdg", "t", "tdg", "sx", "rx", "ry", "rz", "cx", "cy", "cz",
    "cp", "crx", "cry", "crz", "ch", "swap", "ccx", "cswap", "cu", "CX", "phase", "cphase", "id",
    "u1", "u2", "u3",
];

/// Names of the library of OpenQASM 2. Source: the listing in arXiv:1707.03429.
const STANDARD_2: &[&str] = &[
    "u3", "u2", "u1", "cx", "id", "x", "y", "z", "h", "s", "sdg", "t", "tdg", "rx", "ry", "rz",
    "cz", "cy", "ch", "ccx", "crz", "cu1", "cu3",
];

impl<'a> Lowering<'a> {
    /// `gate g(x) a { … }`
    pub(super) fn define(
        &mut self,
        definition: GateDefinition<'a>,
        annotations: &[Annotation<'a>],
    ) -> Lowered<()> {
        self.refuse_annotations(
            annotations,
            "a gate definition",
            "annotate the calls of the gate, or the statements inside",
        )?;
        let name = definition.name;
        for (file, gates) in [("stdgates.inc", STANDARD), ("qelib1.inc", STANDARD_2)] {
            if self.included.contains(file) && gates.contains(&name.text) {
                return Err(Diagnostic::error(
                    name.span,
                    format!("the gate `{}` is declared twice", name.text),
                )
                .with_help(format!("it is defined in \"{file}\"; use another name"))
                .into());
            }
        }
        let names = local_names(&definition)?;
        let mut check = Check {
            lowering: self,
            names: &names,
            variables: Vec::new(),
            noisy: false,
        };
        let depth = 1 + check.body(&definition.body)?;
        let noisy = check.noisy;
        if depth > MAX_NESTING {
            return Err(Diagnostic::error(
                name.span,
                format!("more than {MAX_NESTING} levels of gates inside gates"),
            )
            .into());
        }
        self.declare(name, Entity::Gate(self.definitions.len()))?;
        self.definitions.push(Rc::new(Definition {
            name: Arc::from(name.text),
            names,
            parameters: definition.parameters.len(),
            qubits: definition.qubits.len(),
            body: definition.body,
            noisy,
            depth,
        }));
        Ok(())
    }
}

fn local_names<'a>(definition: &GateDefinition<'a>) -> Lowered<HashMap<&'a str, Local>> {
    let parameters = definition.parameters.iter().zip(0..);
    let qubits = definition.qubits.iter().zip(0..);
    let all = parameters
        .map(|(name, index)| (name, Local::Parameter(index)))
        .chain(qubits.map(|(name, index)| (name, Local::Qubit(index))));
    let mut names = HashMap::new();
    for (name, local) in all {
        if names.insert(name.text, local).is_some() {
            return Err(Diagnostic::error(
                name.span,
                format!("`{}` comes twice in the head of the gate", name.text),
            )
            .into());
        }
    }
    Ok(names)
}

impl<'a> Check<'_, 'a> {
    /// Checks statements; how deep they nest.
    fn body(&mut self, statements: &[Statement<'a>]) -> Lowered<usize> {
        let mut depth = 0;
        for statement in statements {
            self.noisy |= has_noise(&statement.annotations);
            self.annotations(&statement.annotations)?;
            depth = depth.max(self.statement(statement)?);
        }
        Ok(depth)
    }

    fn statement(&mut self, statement: &Statement<'a>) -> Lowered<usize> {
        let what = match &statement.kind {
            StatementKind::Nothing => return Ok(0),
            StatementKind::Call(call) => return self.call(call, statement),
            StatementKind::Barrier(operands) => {
                self.qubits(operands)?;
                return Ok(0);
            }
            StatementKind::Delay { duration, operands } => {
                self.qubits(operands)?;
                self.expression(duration)?;
                return Ok(0);
            }
            StatementKind::For(repeated) => {
                self.lowering.refuse_annotations(
                    &statement.annotations,
                    "a `for` loop",
                    "annotate the statements inside",
                )?;
                return self.for_loop(repeated);
            }
            StatementKind::Measure { .. } => "a measurement",
            StatementKind::Reset(_) => "a reset",
            StatementKind::If(_) => "an `if`",
            StatementKind::Assign { .. } => "an assignment",
            StatementKind::Include(_) => "an `include`",
            StatementKind::Gate(_) => "a gate definition",
            StatementKind::Alias { .. }
            | StatementKind::Bits(_)
            | StatementKind::Constant { .. }
            | StatementKind::Input { .. }
            | StatementKind::Qubits { .. } => "a declaration",
        };
        Err(
            Diagnostic::error(statement.span, format!("{what} inside of a gate"))
                .with_help("a gate holds gate calls, `barrier`, `delay` and `for` loops")
                .into(),
        )
    }

    fn for_loop(&mut self, repeated: &For<'a>) -> Lowered<usize> {
        match &repeated.values {
            Values::Set(elements) => self.expressions(elements)?,
            Values::Range(range, _) => {
                let bounds = [&range.start, &range.step, &range.end];
                for bound in bounds.into_iter().flatten() {
                    self.expression(bound)?;
                }
            }
        }
        self.variables.push(repeated.variable.text);
        let depth = self.body(&repeated.body)?;
        self.variables.pop();
        Ok(depth + 1)
    }

    fn call(&mut self, call: &Call<'a>, statement: &Statement<'a>) -> Lowered<usize> {
        let target = self.lowering.target(call.gate)?;
        let mut controls = 0usize;
        for modifier in &call.modifiers {
            match &modifier.kind {
                ModifierKind::Inverse => {}
                ModifierKind::Power(exponent) => self.expression(exponent)?,
                ModifierKind::Control { count: None, .. } => controls += 1,
                ModifierKind::Control {
                    count: Some(count), ..
                } => {
                    self.constant(count)?;
                    let count = self.lowering.size(count, "the number of controls")?;
                    controls = controls.saturating_add(count);
                }
            }
        }
        self.expressions(&call.parameters)?;
        self.lowering
            .check_counts(&target, call, controls, statement.span)?;
        self.qubits(&call.operands)?;
        self.distinct(&call.operands)?;
        match target {
            Target::Library(gate) => {
                library_controlled(gate, controls, statement.span)?;
                Ok(0)
            }
            Target::Defined(definition) => {
                if controls > 0 && definition.noisy {
                    return Err(super::call::noisy_control(&definition.name, statement.span).into());
                }
                self.noisy |= definition.noisy;
                Ok(definition.depth)
            }
        }
    }

    fn qubits(&mut self, operands: &[Operand<'a>]) -> Lowered<()> {
        for operand in operands {
            let name = operand.name;
            match self.names.get(name.text) {
                Some(Local::Qubit(_)) if !self.variables.contains(&name.text) => {}
                Some(_) => {
                    return Err(Diagnostic::error(
                        name.span,
                        format!("expected qubits here, but `{}` is an angle", name.text),
                    )
                    .into());
                }
                None => return Err(self.foreign(name)),
            }
            if let Some(index) = operand.indices.first() {
                return Err(Diagnostic::error(
                    index.span,
                    format!(
                        "`{}` is a single qubit of the gate and takes no index",
                        name.text
                    ),
                )
                .into());
            }
        }
        Ok(())
    }

    fn foreign(&mut self, name: Name<'a>) -> super::Failure {
        match self.lowering.find(name.text, name.span) {
            Ok(Some(Entity::Unknown)) => super::Failure::Silent,
            Ok(Some(_)) => Diagnostic::error(
                name.span,
                format!("`{}` is not a qubit of this gate", name.text),
            )
            .with_help("a gate acts on the qubits in its head only")
            .into(),
            Ok(None) => {
                let qubits = self.names.keys().copied();
                let error =
                    Diagnostic::error(name.span, format!("`{}` is not declared", name.text));
                match super::suggest::nearest(name.text, qubits) {
                    Some(similar) => error.with_help(format!("did you mean `{similar}`?")),
                    None => error.with_help("a gate acts on the qubits in its head only"),
                }
                .into()
            }
            Err(failure) => failure,
        }
    }

    fn distinct(&self, operands: &[Operand<'a>]) -> Lowered<()> {
        let mut seen = std::collections::HashSet::new();
        for operand in operands {
            if !seen.insert(operand.name.text) {
                return Err(Diagnostic::error(
                    operand.span,
                    format!("the qubit `{}` comes twice in one call", operand.name.text),
                )
                .with_help("the qubits of a call must differ")
                .into());
            }
        }
        Ok(())
    }

    fn annotations(&mut self, annotations: &[Annotation<'a>]) -> Lowered<()> {
        for annotation in annotations {
            if let AnnotationKind::NoiseAfter(channel) | AnnotationKind::NoiseBefore(channel) =
                &annotation.kind
            {
                for argument in &channel.arguments {
                    // A name on its own may stand for itself.
                    if argument.value.nodes.len() > 1 {
                        self.expression(&argument.value)?;
                    }
                }
            }
        }
        Ok(())
    }

    fn expressions(&mut self, expressions: &[Expression<'a>]) -> Lowered<()> {
        expressions
            .iter()
            .try_for_each(|expression| self.expression(expression))
    }

    /// Checks that every name is an angle, a loop variable or a constant.
    fn expression(&mut self, expression: &Expression<'a>) -> Lowered<()> {
        for node in &expression.nodes {
            match &node.kind {
                NodeKind::Name(name) => self.value_name(Name {
                    text: name,
                    span: node.span,
                })?,
                NodeKind::Element(operand) => self.element(operand)?,
                NodeKind::Cast(_, Some(width)) => self.expression(width)?,
                _ => {}
            }
        }
        Ok(())
    }

    fn value_name(&mut self, name: Name<'a>) -> Lowered<()> {
        if self.variables.contains(&name.text) {
            return Ok(());
        }
        match self.names.get(name.text) {
            Some(Local::Parameter(_)) => Ok(()),
            Some(Local::Qubit(_)) => Err(Diagnostic::error(
                name.span,
                format!("`{}` is a qubit, it has no value", name.text),
            )
            .into()),
            None => match self.lowering.lookup(name)? {
                Entity::Constant(_) => Ok(()),
                entity => Err(Diagnostic::error(
                    name.span,
                    format!(
                        "`{}` is {}, a gate knows its angles and constants only",
                        name.text,
                        entity.kind()
                    ),
                )
                .into()),
            },
        }
    }

    fn element(&mut self, operand: &Operand<'a>) -> Lowered<()> {
        Err(Diagnostic::error(
            operand.indices.first().map_or(operand.span, index_span),
            format!("`{}` takes no index in a gate", operand.name.text),
        )
        .into())
    }

    /// Checks that an expression holds no angle and no loop variable.
    fn constant(&mut self, expression: &Expression<'a>) -> Lowered<()> {
        for node in &expression.nodes {
            if let NodeKind::Name(name) = node.kind
                && (self.names.contains_key(name) || self.variables.contains(&name))
            {
                return Err(Diagnostic::error(
                    node.span,
                    format!("the number of controls must not depend on `{name}`"),
                )
                .into());
            }
        }
        Ok(())
    }
}

fn index_span(index: &Index<'_>) -> Span {
    match &index.kind {
        IndexKind::Element(expression) => expression.span,
        IndexKind::Range(_) | IndexKind::Set(_) => index.span,
    }
}

/// Refuses a library gate that has no form with so many controls.
pub(super) fn library_controlled(gate: Gate, controls: usize, span: Span) -> Lowered<()> {
    let mut current = gate;
    for _ in 0..controls {
        let parameters = [0.0; 4];
        current = match current.controlled(&parameters[..current.parameters()]) {
            Some((controlled, _)) => controlled,
            None => return Err(super::call::no_controlled(gate, controls, span).into()),
        };
    }
    Ok(())
}
