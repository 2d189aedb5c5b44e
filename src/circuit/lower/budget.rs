//! What unrolling may spend, so that no input runs away.
//!
//! Three things are counted: operations (what the user asks for), steps of
//! evaluation (so that loops which yield nothing end too), and bytes of the
//! unrolled circuit (so that long expressions, wide calls and many annotations
//! inside loops do not fill the memory).

use super::{Failure, Lowered};
use crate::circuit::diagnostic::{Diagnostic, Span};
use crate::circuit::limits::{BYTES_PER_OPERATION, MIN_BYTES, MIN_STEPS, STEPS_PER_OPERATION};

/// What may be spent and what has been.
#[derive(Debug)]
pub struct Budget {
    max_operations: usize,
    max_steps: u64,
    max_bytes: u64,
    steps: u64,
    bytes: u64,
}

impl Budget {
    /// A budget for this many operations.
    pub fn new(max_operations: usize) -> Self {
        let operations = max_operations as u64;
        Budget {
            max_operations,
            max_steps: operations
                .saturating_mul(STEPS_PER_OPERATION)
                .max(MIN_STEPS),
            max_bytes: operations
                .saturating_mul(BYTES_PER_OPERATION)
                .max(MIN_BYTES),
            steps: 0,
            bytes: 0,
        }
    }

    /// Whether one more operation fits after `operations`.
    pub fn operation(&self, operations: usize, place: Span) -> Lowered<()> {
        if operations < self.max_operations {
            return Ok(());
        }
        Err(Failure::Stop(
            Diagnostic::error(
                place,
                format!(
                    "the circuit unrolls to more than {} operations",
                    grouped(self.max_operations as u64)
                ),
            )
            .with_help("raise the limit with --max-ops if the circuit is meant to be that long"),
        ))
    }

    /// Spends steps of evaluation.
    pub fn step(&mut self, count: u64, place: Span) -> Lowered<()> {
        self.steps = self.steps.saturating_add(count);
        if self.steps <= self.max_steps {
            return Ok(());
        }
        Err(Failure::Stop(
            Diagnostic::error(
                place,
                format!(
                    "unrolling takes more than {} steps",
                    grouped(self.max_steps)
                ),
            )
            .with_help("shorten the loops, or raise the limit with --max-ops"),
        ))
    }

    /// Whether `count` more bytes would fit.
    pub fn would_hold(&self, count: u64, place: Span) -> Lowered<()> {
        if self.bytes.saturating_add(count) <= self.max_bytes {
            return Ok(());
        }
        Err(Failure::Stop(
            Diagnostic::error(
                place,
                format!(
                    "the unrolled circuit takes more than {} MiB",
                    grouped(self.max_bytes >> 20)
                ),
            )
            .with_help(
                "shorten the bit expressions, wide calls or annotations that are repeated, \
                 or raise the limit with --max-ops",
            ),
        ))
    }

    /// Takes bytes that stay in memory.
    pub fn hold(&mut self, count: u64, place: Span) -> Lowered<()> {
        self.would_hold(count, place)?;
        self.bytes += count;
        Ok(())
    }

    /// Gives bytes back.
    pub fn release(&mut self, count: u64) {
        self.bytes = self.bytes.saturating_sub(count);
    }
}

/// A number with commas between groups of three digits.
pub fn grouped(number: u64) -> String {
    let digits = number.to_string();
    let mut text = String::new();
    for (index, digit) in digits.chars().enumerate() {
        if index > 0 && (digits.len() - index).is_multiple_of(3) {
            text.push(',');
        }
        text.push(digit);
    }
    text
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn groups_of_three_digits() {
        for (number, text) in [
            (0, "0"),
            (999, "999"),
            (1000, "1,000"),
            (1_234_567, "1,234,567"),
        ] {
            assert_eq!(grouped(number), text);
        }
    }

    #[test]
    fn a_step_too_many_stops() {
        let mut budget = Budget::new(0);
        assert!(budget.step(MIN_STEPS, Span::default()).is_ok());
        assert!(matches!(
            budget.step(1, Span::default()),
            Err(Failure::Stop(_))
        ));
        assert!(budget.hold(MIN_BYTES, Span::default()).is_ok());
        assert!(budget.hold(1, Span::default()).is_err());
        budget.release(1);
        assert!(budget.hold(1, Span::default()).is_ok());
    }
}
