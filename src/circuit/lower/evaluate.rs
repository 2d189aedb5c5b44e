//! The value of an expression: a stack machine over its postfix nodes.

use smallvec::SmallVec;

use super::scope::{Entity, Kind};
use super::value::{self, Value};
use super::{Failure, Lowered, Lowering, registers};
use crate::circuit::BitExpression;
use crate::circuit::ast::{Binary, Expression, Name, Node, NodeKind, Operand, Scalar};
use crate::circuit::diagnostic::{Diagnostic, Span};

/// How two integers divide.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Division {
    /// As integers, with a warning if something is left over.
    Integer,
    /// As numbers.
    Exact,
}

type Stack = SmallVec<[(Value, Span); 4]>;

impl<'a> Lowering<'a> {
    /// The value of an expression.
    pub(super) fn evaluate(
        &mut self,
        expression: &Expression<'a>,
        division: Division,
    ) -> Lowered<Value> {
        let exact = self.version_2 || division == Division::Exact;
        let mut stack = Stack::new();
        for node in &expression.nodes {
            self.budget.step(1, node.span)?;
            let result = self.node(node, exact, &mut stack)?;
            stack.push(result);
        }
        match stack.pop() {
            Some((value, _)) if stack.is_empty() => Ok(value),
            _ => Err(Diagnostic::error(expression.span, "an expression without a value").into()),
        }
    }

    fn node(&mut self, node: &Node<'a>, exact: bool, stack: &mut Stack) -> Lowered<(Value, Span)> {
        let place = node.span;
        let value = match &node.kind {
            NodeKind::Integer(value) => Value::Integer(*value),
            NodeKind::Float(value) => Value::Float(*value),
            NodeKind::Boolean(value) => Value::Boolean(*value),
            NodeKind::Duration(value) => Value::Duration(*value),
            NodeKind::BitString(digits) => {
                self.budget.step(digits.len() as u64, place)?;
                let bits = digits.bytes().rev().filter(|&digit| digit != b'_');
                Value::Bits(
                    bits.map(|digit| BitExpression::Constant(digit == b'1'))
                        .collect(),
                )
            }
            NodeKind::Name(name) => self.named_value(Name {
                text: name,
                span: place,
            })?,
            NodeKind::Element(operand) => self.element_value(operand)?,
            NodeKind::Unary(operator) => {
                let (operand, inner) = pop(stack, place)?;
                let whole = joined(place, inner);
                self.charge(&operand, whole)?;
                let result = value::unary(*operator, operand);
                return Ok((result.map_err(|why| Diagnostic::error(whole, why))?, whole));
            }
            NodeKind::Binary(operator) => {
                let (right, after) = pop(stack, place)?;
                let (left, before) = pop(stack, place)?;
                let whole = joined(before, after);
                let result = self.combine(*operator, left, right, exact, whole)?;
                return Ok((result, whole));
            }
            NodeKind::Function(function, count) => {
                let mut operands = Vec::new();
                for _ in 0..*count {
                    operands.push(pop(stack, place)?.0);
                }
                operands.reverse();
                value::function(*function, &operands)
                    .map_err(|why| Diagnostic::error(place, why))?
            }
            NodeKind::Cast(scalar, width) => {
                let (operand, _) = pop(stack, place)?;
                let width = match width {
                    Some(width) => Some(self.size(width, "a width")?),
                    None => None,
                };
                cast(*scalar, width, operand).map_err(|why| Diagnostic::error(place, why))?
            }
        };
        Ok((value, place))
    }

    fn combine(
        &mut self,
        operator: Binary,
        left: Value,
        right: Value,
        exact: bool,
        place: Span,
    ) -> Lowered<Value> {
        self.charge(&left, place)?;
        self.charge(&right, place)?;
        if matches!(left, Value::Bits(_)) || matches!(right, Value::Bits(_)) {
            let judged = registers::binary(operator, left, right)
                .map_err(|why| Diagnostic::error(place, why))?;
            if let Some(doubt) = judged.doubt {
                self.warn(Diagnostic::warning(place, doubt));
            }
            return Ok(judged.value);
        }
        if let (Binary::Divide, Value::Integer(a), Value::Integer(b)) = (operator, &left, &right)
            && !exact
            && *b != 0
            && a.checked_rem(*b).is_some_and(|rest| rest != 0)
        {
            let quotient = a / b;
            self.warn(
                Diagnostic::warning(
                    place,
                    format!("{a} / {b} is a division of integers and gives {quotient}"),
                )
                .with_help(format!("write {a}.0 / {b} for a number with a fraction")),
            );
        }
        let result = value::binary(operator, left, right, exact);
        Ok(result.map_err(|why| Diagnostic::error(place, why))?)
    }

    /// Counts the work on a register, and whether its formulas would fit.
    fn charge(&mut self, value: &Value, place: Span) -> Lowered<()> {
        if let Value::Bits(bits) = value {
            let count = bits.len() as u64;
            self.budget.step(count, place)?;
            self.budget
                .would_hold(count * size_of::<BitExpression>() as u64, place)?;
        }
        Ok(())
    }

    fn named_value(&mut self, name: Name<'a>) -> Lowered<Value> {
        match self.lookup(name)? {
            Entity::Constant(value) => Ok(value),
            Entity::Register {
                kind: Kind::Bits,
                places,
                ..
            } => {
                let count = places.len();
                self.budget.step(count as u64, name.span)?;
                self.budget
                    .would_hold(count as u64 * size_of::<BitExpression>() as u64, name.span)?;
                let bits = (0..count).map(|position| BitExpression::Bit(places.at(position)));
                Ok(Value::Bits(bits.collect()))
            }
            Entity::Register { .. } => Err(self.qubits_in_expression(name)),
            entity => Err(Diagnostic::error(
                name.span,
                format!("`{}` is {}, it has no value", name.text, entity.kind()),
            )
            .into()),
        }
    }

    fn element_value(&mut self, operand: &Operand<'a>) -> Lowered<Value> {
        match self.lookup(operand.name)? {
            Entity::Register {
                kind: Kind::Bits, ..
            } => {
                let selected = self.select(operand, Kind::Bits)?;
                let bits = selected.items.iter().map(|&bit| BitExpression::Bit(bit));
                Ok(Value::Bits(bits.collect()))
            }
            Entity::Register { .. } => Err(self.qubits_in_expression(operand.name)),
            entity => Err(Diagnostic::error(
                operand.span,
                format!(
                    "`{}` is {} and takes no index",
                    operand.name.text,
                    entity.kind()
                ),
            )
            .into()),
        }
    }

    fn qubits_in_expression(&self, name: Name<'a>) -> Failure {
        Diagnostic::error(
            name.span,
            format!(
                "`{}` is made of qubits, it has no classical value",
                name.text
            ),
        )
        .with_help("measure it into a bit first, `c = measure q;`, and use the bit")
        .into()
    }

    /// The value of an expression that must be a whole number.
    pub(super) fn integer(&mut self, expression: &Expression<'a>, what: &str) -> Lowered<i128> {
        let value = self.evaluate(expression, Division::Integer)?;
        value.integer().ok_or_else(|| {
            Diagnostic::error(
                expression.span,
                format!("{what} must be a constant integer, found {}", value.kind()),
            )
            .into()
        })
    }

    /// The value of an expression that must be a number.
    pub(super) fn number(
        &mut self,
        expression: &Expression<'a>,
        division: Division,
        what: &str,
    ) -> Lowered<f64> {
        let value = self.evaluate(expression, division)?;
        value.number().ok_or_else(|| {
            Diagnostic::error(
                expression.span,
                format!("{what} must be a constant number, found {}", value.kind()),
            )
            .into()
        })
    }

    /// The value of an expression that must be a size of at least 1.
    pub(super) fn size(&mut self, expression: &Expression<'a>, what: &str) -> Lowered<usize> {
        let value = self.integer(expression, what)?;
        match usize::try_from(value) {
            Ok(size) if size > 0 => Ok(size.min(1 << 40)),
            _ => Err(Diagnostic::error(
                expression.span,
                format!("{what} must be at least 1, found {value}"),
            )
            .into()),
        }
    }
}

fn pop(stack: &mut Stack, place: Span) -> Lowered<(Value, Span)> {
    stack
        .pop()
        .ok_or_else(|| Diagnostic::error(place, "an operator without an operand").into())
}

fn joined(first: Span, last: Span) -> Span {
    Span {
        start: first.start.min(last.start),
        end: first.end.max(last.end),
    }
}

/// A value as another type.
pub(super) fn cast(scalar: Scalar, width: Option<usize>, value: Value) -> Result<Value, String> {
    let cannot = |value: &Value| format!("cannot make `{}` of {}", scalar.name(), value.kind());
    match (scalar, value) {
        (Scalar::Bool, Value::Float(value)) => Ok(Value::Boolean(value != 0.0)),
        (Scalar::Bool, value) => match value.condition()? {
            BitExpression::Constant(value) => Ok(Value::Boolean(value)),
            formula => Ok(Value::Bits(vec![formula])),
        },
        (Scalar::Bit, value) => registers::as_bits(value, width.unwrap_or(1)).map(Value::Bits),
        // Bits taken as a number are compared as one; a width with a sign bit
        // among them would change their value.
        (Scalar::Uint, Value::Bits(bits)) if width.is_none_or(|width| width >= bits.len()) => {
            Ok(Value::Bits(bits))
        }
        (Scalar::Int, Value::Bits(bits)) if width.is_none_or(|width| width > bits.len()) => {
            Ok(Value::Bits(bits))
        }
        (Scalar::Int | Scalar::Uint, Value::Bits(bits)) => Err(format!(
            "`{}[{}]` does not hold a register of {} bits{}",
            scalar.name(),
            width.unwrap_or_default(),
            bits.len(),
            if scalar == Scalar::Int {
                " and a sign; use `uint`"
            } else {
                ""
            }
        )),
        (Scalar::Int | Scalar::Uint, value) => {
            let number = match value {
                Value::Integer(number) => number,
                Value::Boolean(value) => i128::from(value),
                Value::Float(value) if value.abs() < 1e15 => value.trunc() as i128,
                other => return Err(cannot(&other)),
            };
            in_range(scalar, width, number).map(Value::Integer)
        }
        (Scalar::Float | Scalar::Angle, value) => value
            .number()
            .map(Value::Float)
            .ok_or_else(|| cannot(&value)),
    }
}

/// The number, if the type can hold it.
pub(super) fn in_range(scalar: Scalar, width: Option<usize>, number: i128) -> Result<i128, String> {
    let width = width.unwrap_or(64).min(127) as u32;
    let (least, most) = match scalar {
        Scalar::Uint => (0, (1i128 << width).wrapping_sub(1)),
        _ => (-(1i128 << (width - 1)), (1i128 << (width - 1)) - 1),
    };
    // 1 << 127 wraps to the least i128, and one less is the greatest.
    if (least..=most).contains(&number) {
        return Ok(number);
    }
    Err(format!(
        "{number} does not fit into `{}[{width}]`, which holds {least} to {most}",
        scalar.name()
    ))
}
