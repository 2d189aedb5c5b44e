//! `if` and `for`.
//!
//! A condition is read once, into a hidden bit, before its block: what the block
//! writes does not change it. Inner conditions are and-ed with the one around.
//! A condition of constants picks its branch here and now.

use super::evaluate::Division;
use super::scope::Entity;
use super::value::Value;
use super::{Failure, Lowered, Lowering, bits};
use crate::circuit::BitExpression;
use crate::circuit::ast::{Expression, For, If, Scalar, Statement, Values};
use crate::circuit::diagnostic::{Diagnostic, Span};
use crate::circuit::limits::MAX_NESTING;

impl<'a> Lowering<'a> {
    /// `if (…) … else …`
    pub(super) fn conditional(&mut self, conditional: &If<'a>, span: Span) -> Lowered<()> {
        self.outside_of_gates("an `if`", span)?;
        let place = conditional.condition.span;
        let value = self.evaluate(&conditional.condition, Division::Integer)?;
        let condition = value
            .condition()
            .map_err(|why| Diagnostic::error(place, why))?;
        if let BitExpression::Constant(holds) = condition {
            let taken = if holds {
                &conditional.then
            } else {
                &conditional.otherwise
            };
            return self.deeper(place, |lowering| lowering.block(taken));
        }
        let around = self.condition;
        let hidden = self.hidden_bits;
        let bit = self.hidden(1, place)?;
        let holds = match around {
            Some(outer) => bits::and(BitExpression::Bit(outer), condition),
            None => condition,
        };
        self.emit_always(bit, holds, place)?;
        self.under(bit, &conditional.then, place)?;
        if !conditional.otherwise.is_empty() {
            // ¬(outer ∧ condition) ∧ outer = outer ∧ ¬condition
            let fails = bits::not(BitExpression::Bit(bit));
            let fails = match around {
                Some(outer) => bits::and(BitExpression::Bit(outer), fails),
                None => fails,
            };
            self.emit_always(bit, fails, place)?;
            self.under(bit, &conditional.otherwise, place)?;
        }
        self.free_hidden(hidden);
        Ok(())
    }

    /// Lowers a block under the condition held by a hidden bit.
    fn under(&mut self, bit: u32, statements: &[Statement<'a>], place: Span) -> Lowered<()> {
        let around = self.condition.replace(bit);
        let outcome = self.deeper(place, |lowering| lowering.block(statements));
        self.condition = around;
        outcome
    }

    /// Runs `inner` one level of blocks and calls deeper.
    pub(super) fn deeper<T>(
        &mut self,
        place: Span,
        inner: impl FnOnce(&mut Self) -> Lowered<T>,
    ) -> Lowered<T> {
        if self.depth >= MAX_NESTING {
            return Err(Failure::Stop(
                Diagnostic::error(
                    place,
                    format!("more than {MAX_NESTING} levels of blocks and gate calls"),
                )
                .with_help("flatten the blocks or the gate definitions"),
            ));
        }
        self.depth += 1;
        let outcome = inner(self);
        self.depth -= 1;
        outcome
    }

    /// `for int i in … …`
    pub(super) fn for_loop(&mut self, repeated: &For<'a>, span: Span) -> Lowered<()> {
        if repeated.kind.scalar == Scalar::Bit {
            return Err(
                Diagnostic::error(repeated.kind.span, "a loop variable of type `bit`")
                    .with_help("use `int`, and index the register with it")
                    .into(),
            );
        }
        match &repeated.values {
            Values::Set(elements) => self.loop_over_set(repeated, elements, span),
            Values::Range(range, place) => {
                let (Some(start), Some(end)) = (&range.start, &range.end) else {
                    return Err(
                        Diagnostic::error(*place, "the range of a loop needs both ends")
                            .with_help("write `[0:3]` or `[0:2:8]`, ends included")
                            .into(),
                    );
                };
                let start = self.integer(start, "the start of a range")?;
                let end = self.integer(end, "the end of a range")?;
                let step = match &range.step {
                    Some(step) => self.integer(step, "the step of a range")?,
                    None => 1,
                };
                if step == 0 {
                    return Err(Diagnostic::error(*place, "a range with step 0").into());
                }
                self.loop_over_range(repeated, (start, step, end), span)
            }
        }
    }

    fn loop_over_set(
        &mut self,
        repeated: &For<'a>,
        elements: &[Expression<'a>],
        span: Span,
    ) -> Lowered<()> {
        let backwards = self.backwards();
        for index in 0..elements.len() {
            let index = if backwards {
                elements.len() - 1 - index
            } else {
                index
            };
            let element = &elements[index];
            let value = self.evaluate(element, Division::Integer)?;
            if !self.pass(repeated, value, element.span, span)? {
                break;
            }
        }
        Ok(())
    }

    fn loop_over_range(
        &mut self,
        repeated: &For<'a>,
        (start, step, end): (i128, i128, i128),
        span: Span,
    ) -> Lowered<()> {
        let too_long = || Diagnostic::error(span, "the range of a loop is too long");
        let distance = if step > 0 {
            end.checked_sub(start)
        } else {
            start.checked_sub(end)
        };
        let distance = distance.ok_or_else(too_long)?;
        if distance < 0 {
            return Ok(());
        }
        let last = distance / step.checked_abs().ok_or_else(too_long)?;
        let backwards = self.backwards();
        for pass in 0..=last {
            let pass = if backwards { last - pass } else { pass };
            // Between start and end, so it cannot overflow.
            let value = Value::Integer(start + pass * step);
            if !self.pass(repeated, value, repeated.variable.span, span)? {
                break;
            }
        }
        Ok(())
    }

    /// Whether loops run from their last value to their first.
    fn backwards(&self) -> bool {
        self.frame.as_ref().is_some_and(|frame| frame.inverse)
    }

    /// One pass of a loop. Whether the next one is worth a try.
    fn pass(&mut self, repeated: &For<'a>, value: Value, place: Span, span: Span) -> Lowered<bool> {
        self.budget.step(1, span)?;
        let value = self.typed(&repeated.kind, value, place)?;
        let failures = self.failures;
        let scopes = self.scopes.len();
        self.open_scope();
        self.set(repeated.variable, Entity::Constant(value));
        let outcome = self.deeper(span, |lowering| {
            if lowering.frame.is_some() {
                lowering.run_body(&repeated.body)
            } else {
                lowering.block(&repeated.body)
            }
        });
        self.close_scopes(scopes);
        outcome?;
        Ok(self.failures == failures)
    }
}
