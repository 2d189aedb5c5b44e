//! One statement.

use super::{Failure, Lowered, Lowering};
use crate::circuit::ast::{Annotation, Name, Statement, StatementKind};
use crate::circuit::diagnostic::Diagnostic;

const PUT_BEFORE: &str = "put it before a gate, `measure`, `reset`, `delay` or `barrier`";

impl<'a> Lowering<'a> {
    /// Lowers a statement of the file. Whether reading can go on.
    pub fn top_level(&mut self, statement: Statement<'a>) -> bool {
        let name = declared(&statement);
        let outcome = match statement.kind {
            StatementKind::Gate(definition) => self.define(*definition, &statement.annotations),
            _ => self.statement(&statement),
        };
        if let (Err(_), Some(name)) = (&outcome, name) {
            self.declare_unknown(name);
        }
        self.settle(outcome)
    }

    /// Lowers the statements of a block, as far as they can be.
    pub(super) fn block(&mut self, statements: &[Statement<'a>]) -> Lowered<()> {
        let scopes = self.scopes.len();
        self.open_scope();
        let outcome = self.statements(statements);
        self.close_scopes(scopes);
        outcome
    }

    fn statements(&mut self, statements: &[Statement<'a>]) -> Lowered<()> {
        for statement in statements {
            match self.statement(statement) {
                Ok(()) => {}
                // Inside a gate, the call as a whole fails.
                Err(failure) if self.frame.is_some() => return Err(failure),
                Err(Failure::Stop(error)) => return Err(Failure::Stop(error)),
                Err(Failure::Error(error)) => {
                    if let Some(name) = declared(statement) {
                        self.declare_unknown(name);
                    }
                    if !self.report(error.clone()) {
                        return Err(Failure::Stop(error));
                    }
                }
                Err(Failure::Silent) => {
                    if let Some(name) = declared(statement) {
                        self.declare_unknown(name);
                    }
                    self.failures += 1;
                }
            }
        }
        Ok(())
    }

    pub(super) fn statement(&mut self, statement: &Statement<'a>) -> Lowered<()> {
        let span = statement.span;
        let annotations = statement.annotations.as_slice();
        self.budget.step(1, span)?;
        let plain = |lowering: &Self, what: &str| {
            lowering.refuse_annotations(annotations, what, PUT_BEFORE)
        };
        match &statement.kind {
            StatementKind::Nothing => plain(self, "this statement"),
            StatementKind::Include(file) => {
                plain(self, "an `include`")?;
                self.only_at_top(statement, "`include`")?;
                self.include(*file)
            }
            StatementKind::Qubits { name, size } => {
                plain(self, "a declaration")?;
                self.only_at_top(statement, "a declaration of qubits")?;
                self.qubits(*name, size.as_ref())
            }
            StatementKind::Bits(declaration) => {
                self.only_at_top(statement, "a declaration of bits")?;
                self.bits(declaration, annotations, span)
            }
            StatementKind::Constant { kind, name, value } => {
                plain(self, "a declaration")?;
                self.constant(kind, *name, value)
            }
            StatementKind::Input { kind, name } => {
                plain(self, "a declaration")?;
                self.only_at_top(statement, "a declaration of an input")?;
                self.input(kind, *name)
            }
            StatementKind::Alias { name, parts } => {
                plain(self, "a declaration")?;
                self.alias(*name, parts)
            }
            StatementKind::Gate(_) => self.only_at_top(statement, "a gate definition"),
            StatementKind::Call(call) => self.call(call, annotations, span),
            StatementKind::Measure { source, target } => {
                self.measure(source, target.as_ref(), annotations, span)
            }
            StatementKind::Assign {
                target,
                operator,
                value,
            } => self.assign(target, *operator, value, annotations, span),
            StatementKind::Reset(operand) => self.reset(operand, annotations, span),
            StatementKind::Barrier(operands) => self.barrier(operands, annotations, span),
            StatementKind::Delay { duration, operands } => {
                self.delay(duration, operands, annotations, span)
            }
            StatementKind::If(conditional) => {
                self.refuse_annotations(annotations, "an `if`", "annotate the statements inside")?;
                self.conditional(conditional, span)
            }
            StatementKind::For(repeated) => {
                self.refuse_annotations(
                    annotations,
                    "a `for` loop",
                    "annotate the statements inside",
                )?;
                self.for_loop(repeated, span)
            }
        }
    }

    fn only_at_top(&self, statement: &Statement<'a>, what: &str) -> Lowered<()> {
        if self.at_top_level() {
            return Ok(());
        }
        Err(
            Diagnostic::error(statement.span, format!("{what} inside of a block"))
                .with_help("move it to the top of the file")
                .into(),
        )
    }
}

/// The name that a statement declares, if it declares one.
fn declared<'a>(statement: &Statement<'a>) -> Option<Name<'a>> {
    match &statement.kind {
        StatementKind::Qubits { name, .. }
        | StatementKind::Constant { name, .. }
        | StatementKind::Input { name, .. }
        | StatementKind::Alias { name, .. } => Some(*name),
        StatementKind::Bits(declaration) => Some(declaration.name),
        StatementKind::Gate(definition) => Some(definition.name),
        _ => None,
    }
}

/// Whether any annotation is noise.
pub(super) fn has_noise(annotations: &[Annotation<'_>]) -> bool {
    use crate::circuit::ast::AnnotationKind::{NoiseAfter, NoiseBefore};
    annotations
        .iter()
        .any(|annotation| matches!(annotation.kind, NoiseAfter(_) | NoiseBefore(_)))
}
