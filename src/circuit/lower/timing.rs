//! Measurement, reset, delay and barrier.

use smallvec::SmallVec;

use super::evaluate::Division;
use super::scope::Kind;
use super::value::Value;
use super::{Lowered, Lowering};
use crate::circuit::ast::{Annotation, Expression, Operand};
use crate::circuit::diagnostic::{Diagnostic, Span};
use crate::circuit::{Action, Qubits};

impl<'a> Lowering<'a> {
    /// `measure q -> c;`, `c = measure q;`, `measure q;`
    pub(super) fn measure(
        &mut self,
        source: &Operand<'a>,
        target: Option<&Operand<'a>>,
        annotations: &[Annotation<'a>],
        span: Span,
    ) -> Lowered<()> {
        self.outside_of_gates("a measurement", span)?;
        let qubits = self.select(source, Kind::Qubits)?;
        let bits = match target {
            Some(target) => Some(self.select(target, Kind::Bits)?),
            None => None,
        };
        if let Some(bits) = &bits
            && bits.items.len() != qubits.items.len()
        {
            return Err(widths(qubits.items.len(), bits.items.len(), span).into());
        }
        let bit = |position: usize| bits.as_ref().map(|bits| bits.items[position]);
        self.measure_into(&qubits.items, bit, annotations, span)
    }

    /// Measures each qubit into the bit at the same position.
    pub(super) fn measure_into(
        &mut self,
        qubits: &[u32],
        bit: impl Fn(usize) -> Option<u32>,
        annotations: &[Annotation<'a>],
        span: Span,
    ) -> Lowered<()> {
        let noise = self.noise(annotations)?;
        for (position, &qubit) in qubits.iter().enumerate() {
            let action = Action::Measure {
                qubit,
                bit: bit(position),
            };
            self.emit(action, noise.clone(), span)?;
        }
        Ok(())
    }

    /// `reset q;`
    pub(super) fn reset(
        &mut self,
        operand: &Operand<'a>,
        annotations: &[Annotation<'a>],
        span: Span,
    ) -> Lowered<()> {
        self.outside_of_gates("a reset", span)?;
        let qubits = self.select(operand, Kind::Qubits)?;
        let noise = self.noise(annotations)?;
        for &qubit in &qubits.items {
            self.emit(Action::Reset { qubit }, noise.clone(), span)?;
        }
        Ok(())
    }

    /// `delay[100ns] q;`
    pub(super) fn delay(
        &mut self,
        duration: &Expression<'a>,
        operands: &[Operand<'a>],
        annotations: &[Annotation<'a>],
        span: Span,
    ) -> Lowered<()> {
        let seconds = match self.evaluate(duration, Division::Integer)? {
            Value::Duration(seconds) if seconds >= 0.0 => seconds,
            Value::Duration(_) => {
                return Err(Diagnostic::error(duration.span, "a delay that is negative").into());
            }
            other => {
                return Err(Diagnostic::error(
                    duration.span,
                    format!("expected a duration, found {}", other.kind()),
                )
                .with_help("write a number with a unit, such as `100ns`, `1.5us` or `2ms`")
                .into());
            }
        };
        let qubits = self.places_of(operands, span)?;
        let noise = self.noise(annotations)?;
        for qubit in qubits {
            self.emit(Action::Delay { qubit, seconds }, noise.clone(), span)?;
        }
        Ok(())
    }

    /// `barrier a, b;` It is written only if it carries noise.
    pub(super) fn barrier(
        &mut self,
        operands: &[Operand<'a>],
        annotations: &[Annotation<'a>],
        span: Span,
    ) -> Lowered<()> {
        let qubits = self.places_of(operands, span)?;
        let Some(noise) = self.noise(annotations)? else {
            return Ok(());
        };
        if qubits.is_empty() {
            return Err(Diagnostic::error(span, "noise on a barrier without qubits").into());
        }
        self.refuse_repeated(&qubits, span)?;
        self.emit(Action::Barrier { qubits }, Some(noise), span)
    }

    /// The qubits of all operands, or every qubit in sight if there are none.
    fn places_of(&mut self, operands: &[Operand<'a>], span: Span) -> Lowered<Qubits> {
        if operands.is_empty() {
            let qubits = match &self.frame {
                Some(frame) => frame.qubits.clone(),
                None => (0..self.qubits.len() as u32).collect(),
            };
            self.budget.step(qubits.len() as u64, span)?;
            return Ok(qubits);
        }
        let mut qubits = SmallVec::new();
        for operand in operands {
            qubits.extend(self.select(operand, Kind::Qubits)?.items);
        }
        Ok(qubits)
    }

    /// Refuses a qubit that comes twice.
    pub(super) fn refuse_repeated(&self, qubits: &[u32], span: Span) -> Lowered<()> {
        const FEW: usize = 8;
        let repeated = if qubits.len() <= FEW {
            let mut pairs = qubits.iter().enumerate();
            pairs
                .find(|(position, qubit)| qubits[..*position].contains(qubit))
                .map(|(_, &qubit)| qubit)
        } else {
            let mut sorted = qubits.to_vec();
            sorted.sort_unstable();
            let twice = sorted.windows(2).find(|pair| pair[0] == pair[1]);
            twice.map(|pair| pair[0])
        };
        let Some(qubit) = repeated else {
            return Ok(());
        };
        Err(Diagnostic::error(
            span,
            format!(
                "the qubit `{}` comes twice in one call",
                self.qubits[qubit as usize]
            ),
        )
        .with_help("the qubits of a call must differ")
        .into())
    }

    /// Refuses what cannot stand in a gate body.
    pub(super) fn outside_of_gates(&self, what: &str, span: Span) -> Lowered<()> {
        if self.frame.is_none() {
            return Ok(());
        }
        Err(Diagnostic::error(span, format!("{what} inside of a gate")).into())
    }
}

/// The error for a measurement of so many qubits into so many bits.
pub(super) fn widths(qubits: usize, bits: usize, span: Span) -> Diagnostic {
    let s = |count: usize| if count == 1 { "" } else { "s" };
    Diagnostic::error(
        span,
        format!(
            "a measurement of {qubits} qubit{} into {bits} bit{}",
            s(qubits),
            s(bits)
        ),
    )
    .with_help("both sides must have the same length")
}
