//! Writing operations, and the hidden bits they use.

use std::sync::Arc;

use super::{Failure, HIDDEN, Lowered, Lowering, bits};
use crate::circuit::diagnostic::{Diagnostic, Span};
use crate::circuit::limits::MAX_BITS;
use crate::circuit::{
    Action, AnnotatedNoise, BitExpression, ChannelArgument, ChannelCall, Operation,
};

impl Lowering<'_> {
    /// Writes an operation under the condition around it.
    pub(super) fn emit(
        &mut self,
        action: Action,
        noise: Option<Box<AnnotatedNoise>>,
        span: Span,
    ) -> Lowered<()> {
        self.emit_if(self.condition, action, noise, span)
    }

    /// Writes an assignment that happens whatever the condition around it.
    pub(super) fn emit_always(
        &mut self,
        bit: u32,
        value: BitExpression,
        span: Span,
    ) -> Lowered<()> {
        let value = Arc::new(value);
        self.emit_if(None, Action::Assign { bit, value }, None, span)
    }

    fn emit_if(
        &mut self,
        condition: Option<u32>,
        action: Action,
        noise: Option<Box<AnnotatedNoise>>,
        span: Span,
    ) -> Lowered<()> {
        self.budget.operation(self.operations.len(), span)?;
        let bytes = size_of::<Operation>() as u64
            + action_bytes(&action)
            + noise.as_deref().map_or(0, noise_bytes);
        self.budget.hold(bytes, span)?;
        self.operations.push(Operation {
            action,
            condition,
            noise,
            span,
        });
        Ok(())
    }

    /// Fresh hidden bits, in a row. They are free again when
    /// [`Lowering::free_hidden`] is given the count from before.
    pub(super) fn hidden(&mut self, count: usize, place: Span) -> Lowered<u32> {
        let first = self.hidden_bits;
        self.check_bits(self.declared_bits, first.saturating_add(count), place)?;
        self.hidden_bits += count;
        self.hidden_peak = self.hidden_peak.max(self.hidden_bits);
        Ok(HIDDEN | first as u32)
    }

    /// Frees the hidden bits after the first `count`.
    pub(super) fn free_hidden(&mut self, count: usize) {
        self.hidden_bits = count;
    }

    /// Whether so many bits are allowed.
    pub(super) fn check_bits(&self, declared: usize, hidden: usize, place: Span) -> Lowered<()> {
        let hidden = hidden.max(self.hidden_peak);
        if declared.saturating_add(hidden) <= MAX_BITS {
            return Ok(());
        }
        Err(Failure::Error(Diagnostic::error(
            place,
            format!(
                "more than {} classical bits",
                super::grouped(MAX_BITS as u64)
            ),
        )))
    }

    /// Gives hidden bits the numbers after the declared ones.
    pub(super) fn settle_hidden_bits(&mut self) {
        if self.hidden_peak == 0 {
            return;
        }
        let declared = self.declared_bits as u32;
        let settled = |bit: u32| {
            if bit & HIDDEN == 0 {
                bit
            } else {
                declared + (bit & !HIDDEN)
            }
        };
        for operation in &mut self.operations {
            operation.condition = operation.condition.map(settled);
            match &mut operation.action {
                Action::Assign { bit, value } => {
                    *bit = settled(*bit);
                    bits::renumber(Arc::make_mut(value), &settled);
                }
                Action::Measure { bit, .. } => *bit = bit.map(settled),
                _ => {}
            }
        }
    }
}

/// Bytes an action takes outside of itself.
fn action_bytes(action: &Action) -> u64 {
    let words = match action {
        Action::Gate { qubits, .. } | Action::Call { qubits, .. } | Action::Barrier { qubits } => {
            if qubits.spilled() {
                qubits.len()
            } else {
                0
            }
        }
        Action::Assign { value, .. } => {
            return bits::size(value) * size_of::<BitExpression>() as u64;
        }
        Action::Measure { .. } | Action::Reset { .. } | Action::Delay { .. } => 0,
    };
    (words * size_of::<u32>()) as u64
}

/// Bytes that annotated noise takes.
pub(super) fn noise_bytes(noise: &AnnotatedNoise) -> u64 {
    let calls = noise.before.iter().chain(&noise.after);
    let bytes = calls.map(|call| {
        size_of::<ChannelCall>()
            + call.name.len()
            + call
                .arguments
                .iter()
                .map(|argument| {
                    size_of::<ChannelArgument>() + argument.name.as_ref().map_or(0, String::len)
                })
                .sum::<usize>()
    });
    (size_of::<AnnotatedNoise>() + bytes.sum::<usize>()) as u64
}
