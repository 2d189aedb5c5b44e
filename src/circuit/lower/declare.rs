//! Declarations: registers, constants, inputs and built-in files.

use super::evaluate::{Division, cast, in_range};
use super::scope::{Entity, Kind, Places};
use super::suggest::nearest;
use super::value::Value;
use super::{Failure, Lowered, Lowering, grouped};
use crate::circuit::Register;
use crate::circuit::ast::{
    Annotation, Assigned, BitDeclaration, Expression, Name, Operand, Scalar, Type,
};
use crate::circuit::diagnostic::{Diagnostic, Span};
use crate::circuit::limits::MAX_QUBITS;

/// The files that are built in.
const BUILT_IN_FILES: &[&str] = &["stdgates.inc", "qelib1.inc"];

impl<'a> Lowering<'a> {
    /// `include "…";`
    pub(super) fn include(&mut self, file: Name<'a>) -> Lowered<()> {
        match BUILT_IN_FILES.iter().find(|known| **known == file.text) {
            Some(known) => {
                self.included.insert(known);
                Ok(())
            }
            None => Err(Diagnostic::error(
                file.span,
                format!("the file `{}` is not known, and no file is read", file.text),
            )
            .with_help("built in are \"stdgates.inc\" and \"qelib1.inc\"; copy other gates here")
            .into()),
        }
    }

    /// `qubit[n] q;`
    pub(super) fn qubits(&mut self, name: Name<'a>, size: Option<&Expression<'a>>) -> Lowered<()> {
        let count = match size {
            Some(size) => self.size(size, "the number of qubits")?,
            None => 1,
        };
        if self.qubits.len().saturating_add(count) > MAX_QUBITS {
            return Err(Diagnostic::error(
                size.map_or(name.span, |size| size.span),
                format!(
                    "more than {} qubits in the circuit",
                    grouped(MAX_QUBITS as u64)
                ),
            )
            .into());
        }
        let entity = register(Kind::Qubits, self.qubits.len(), count, size.is_none());
        self.declare(name, entity)?;
        if size.is_none() {
            self.qubits.push(name.text.to_owned());
        } else {
            self.qubits
                .extend((0..count).map(|index| format!("{}[{index}]", name.text)));
        }
        Ok(())
    }

    /// `bit[n] c;`, `output bit[n] c;`, `bit c = measure q;`
    pub(super) fn bits(
        &mut self,
        declaration: &BitDeclaration<'a>,
        annotations: &[Annotation<'a>],
        span: Span,
    ) -> Lowered<()> {
        let name = declaration.name;
        let (role, annotations) = self.role(annotations)?;
        if !matches!(declaration.value, Some(Assigned::Measure(_))) {
            self.refuse_annotations(
                &annotations,
                "a declaration",
                "put it before a gate, `measure`, `reset`, `delay` or `barrier`",
            )?;
        }
        let width = match &declaration.size {
            Some(size) => self.size(size, "the number of bits")?,
            None => 1,
        };
        self.check_bits(self.declared_bits.saturating_add(width), 0, name.span)?;
        let first = self.declared_bits;
        let entity = register(Kind::Bits, first, width, declaration.size.is_none());
        self.declare(name, entity)?;
        self.declared_bits += width;
        self.any_output |= declaration.output;
        self.registers.push(Register {
            name: name.text.to_owned(),
            first,
            width,
            role,
            recorded: declaration.output,
        });
        let target = Operand {
            name,
            indices: Vec::new(),
            span: name.span,
        };
        match &declaration.value {
            None => Ok(()),
            Some(value) => self.assign(&target, None, value, &annotations, span),
        }
    }

    /// `const int n = 3;`
    pub(super) fn constant(
        &mut self,
        kind: &Type<'a>,
        name: Name<'a>,
        value: &Expression<'a>,
    ) -> Lowered<()> {
        let found = self.evaluate(value, Division::Integer)?;
        let typed = self.typed(kind, found, value.span)?;
        self.declare(name, Entity::Constant(typed))
    }

    /// A value as one of a declared type.
    pub(super) fn typed(&mut self, kind: &Type<'a>, value: Value, place: Span) -> Lowered<Value> {
        let width = match &kind.width {
            Some(width) => Some(self.size(width, "a width")?),
            None => None,
        };
        let scalar = kind.scalar;
        if let Value::Bits(_) = value {
            return Err(
                Diagnostic::error(place, "the value of a constant depends on bits")
                    .with_help("keep measured values in a `bit` register")
                    .into(),
            );
        }
        let result = match scalar {
            Scalar::Bit => Err("constants of type `bit` are not supported; use `uint`".to_owned()),
            Scalar::Int | Scalar::Uint => match value {
                Value::Boolean(value) => Ok(Value::Integer(i128::from(value))),
                ref whole => match whole.integer() {
                    Some(number) => in_range(scalar, width, number).map(Value::Integer),
                    None => Err(format!(
                        "expected a whole number for `{}`, found {}",
                        scalar.name(),
                        whole.kind()
                    )),
                },
            },
            Scalar::Float | Scalar::Angle | Scalar::Bool => cast(scalar, width, value),
        };
        Ok(result.map_err(|why| Diagnostic::error(place, why))?)
    }

    /// `input float x;`
    pub(super) fn input(&mut self, kind: &Type<'a>, name: Name<'a>) -> Lowered<()> {
        self.used_inputs.insert(name.text);
        let Some(&value) = self.inputs.get(name.text) else {
            return Err(Diagnostic::error(
                name.span,
                format!("the input `{}` has no value", name.text),
            )
            .with_help(format!("give it one with --set {}=VALUE", name.text))
            .into());
        };
        if !value.is_finite() {
            return Err(Diagnostic::error(
                name.span,
                format!("--set gives the input `{}` no finite value", name.text),
            )
            .into());
        }
        let typed = match self.typed(kind, Value::Float(value), name.span) {
            Err(Failure::Error(error)) => {
                let help = format!("--set gives `{}` the value {value}", name.text);
                return Err(error.with_help(help).into());
            }
            other => other?,
        };
        self.declare(name, Entity::Constant(typed))
    }

    /// Reports values given to inputs that the circuit does not have.
    pub(super) fn check_inputs(&mut self) {
        let inputs = self.inputs;
        for name in inputs.keys() {
            let name = name.as_str();
            if self.used_inputs.contains(name) || self.doubtful.contains(name) {
                continue;
            }
            let known = self.used_inputs.iter().copied();
            let help = match (nearest(name, known), self.scopes[0].holds(name)) {
                (_, true) => format!("`{name}` is declared, but not as an `input`"),
                (Some(similar), _) => format!("did you mean `{similar}`?"),
                _ => format!("declare it in the circuit, `input float {name};`"),
            };
            let error = Diagnostic {
                span: None,
                ..Diagnostic::error(
                    Span::default(),
                    format!("--set {name}: the circuit has no input `{name}`"),
                )
            };
            self.report(error.with_help(help));
        }
    }
}

fn register(kind: Kind, first: usize, count: usize, single: bool) -> Entity {
    Entity::Register {
        kind,
        places: Places::Run {
            first: first as u32,
            count: count as u32,
        },
        single,
    }
}
