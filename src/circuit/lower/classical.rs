//! Assignments to bits. All of the right-hand side is read before any bit is
//! written.

use std::collections::HashMap;
use std::sync::Arc;

use super::evaluate::Division;
use super::scope::{Entity, Kind};
use super::select::Selected;
use super::value::Value;
use super::{Lowered, Lowering, bits, registers, timing};
use crate::circuit::ast::{Annotation, Assigned, Binary, Expression, Operand};
use crate::circuit::diagnostic::{Diagnostic, Span};
use crate::circuit::{Action, BitExpression};

impl<'a> Lowering<'a> {
    /// `c = …;`, `c ^= …;`
    pub(super) fn assign(
        &mut self,
        target: &Operand<'a>,
        operator: Option<Binary>,
        value: &Assigned<'a>,
        annotations: &[Annotation<'a>],
        span: Span,
    ) -> Lowered<()> {
        self.outside_of_gates("an assignment", span)?;
        let hidden = self.hidden_bits;
        let outcome = match (value, operator) {
            (Assigned::Measure(source), None) => {
                self.writable(target)?;
                self.measure(source, Some(target), annotations, span)
            }
            (Assigned::Measure(source), Some(operator)) => {
                self.combine_measured(target, operator, source, annotations, span)
            }
            (Assigned::Expression(value), operator) => {
                self.refuse_annotations(
                    annotations,
                    "an assignment, which acts on no qubit",
                    "put it before a gate, `measure`, `reset`, `delay` or `barrier`",
                )?;
                self.assign_expression(target, operator, value, span)
            }
        };
        self.free_hidden(hidden);
        outcome
    }

    fn writable(&mut self, target: &Operand<'a>) -> Lowered<Selected> {
        if let Entity::Constant(_) = self.lookup(target.name)? {
            return Err(Diagnostic::error(
                target.span,
                format!(
                    "`{}` is a constant or a loop variable and cannot be written",
                    target.name.text
                ),
            )
            .with_help("keep measured values in a `bit` register")
            .into());
        }
        self.select(target, Kind::Bits)
    }

    /// `c ^= measure q;`: the outcomes wait in hidden bits.
    fn combine_measured(
        &mut self,
        target: &Operand<'a>,
        operator: Binary,
        source: &Operand<'a>,
        annotations: &[Annotation<'a>],
        span: Span,
    ) -> Lowered<()> {
        let bits = self.writable(target)?;
        let qubits = self.select(source, Kind::Qubits)?;
        if bits.items.len() != qubits.items.len() {
            return Err(timing::widths(qubits.items.len(), bits.items.len(), span).into());
        }
        let first = self.hidden(bits.items.len(), span)?;
        let outcome = |position: usize| first + position as u32;
        self.measure_into(
            &qubits.items,
            |position| Some(outcome(position)),
            annotations,
            span,
        )?;
        let outcomes = (0..bits.items.len()).map(|position| BitExpression::Bit(outcome(position)));
        let outcomes = Value::Bits(outcomes.collect());
        let values = self.combined(&bits, operator, outcomes, span)?;
        self.write(&bits.items, values, span)
    }

    fn assign_expression(
        &mut self,
        target: &Operand<'a>,
        operator: Option<Binary>,
        value: &Expression<'a>,
        span: Span,
    ) -> Lowered<()> {
        let bits = self.writable(target)?;
        let value_span = value.span;
        let value = self.evaluate(value, Division::Integer)?;
        let values = match operator {
            Some(operator) => self.combined(&bits, operator, value, span)?,
            None => registers::as_bits(value, bits.items.len()).map_err(|why| {
                Diagnostic::error(value_span, format!("`{}`: {why}", target.name.text))
            })?,
        };
        self.write(&bits.items, values, span)
    }

    /// The bits combined with a value.
    fn combined(
        &mut self,
        bits: &Selected,
        operator: Binary,
        value: Value,
        span: Span,
    ) -> Lowered<Vec<BitExpression>> {
        let before = bits.items.iter().map(|&bit| BitExpression::Bit(bit));
        let judged = registers::binary(operator, Value::Bits(before.collect()), value)
            .map_err(|why| Diagnostic::error(span, why))?;
        match judged.value {
            Value::Bits(values) => Ok(values),
            other => Err(
                Diagnostic::error(span, format!("expected bits, found {}", other.kind())).into(),
            ),
        }
    }

    /// Writes values into bits; by way of hidden bits if a value reads a bit
    /// that is written before it.
    fn write(&mut self, bits: &[u32], values: Vec<BitExpression>, span: Span) -> Lowered<()> {
        let nodes: u64 = values.iter().map(bits::size).sum();
        self.budget.step(nodes, span)?;
        let first = if reads_written(bits, &values) {
            Some(self.hidden(bits.len(), span)?)
        } else {
            None
        };
        let Some(first) = first else {
            return self.write_in_order(bits.iter().copied().zip(values), span);
        };
        for (position, value) in values.into_iter().enumerate() {
            self.emit_always(first + position as u32, value, span)?;
        }
        let copies = bits
            .iter()
            .enumerate()
            .map(|(position, &bit)| (bit, BitExpression::Bit(first + position as u32)));
        self.write_in_order(copies, span)
    }

    fn write_in_order(
        &mut self,
        assignments: impl Iterator<Item = (u32, BitExpression)>,
        span: Span,
    ) -> Lowered<()> {
        for (bit, value) in assignments {
            let value = Arc::new(value);
            self.emit(Action::Assign { bit, value }, None, span)?;
        }
        Ok(())
    }
}

/// Whether a value reads a bit that an earlier one has written.
fn reads_written(bits: &[u32], values: &[BitExpression]) -> bool {
    if bits.len() < 2 {
        return false;
    }
    let positions: HashMap<u32, usize> = bits.iter().copied().zip(0..).collect();
    values.iter().enumerate().any(|(position, value)| {
        let mut early = false;
        bits::reads(value, &mut |bit| {
            early |= positions.get(&bit).is_some_and(|&at| at < position);
        });
        early
    })
}
