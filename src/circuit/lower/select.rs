//! Which qubits or bits an operand means: indices, ranges and sets.

use std::collections::HashSet;

use smallvec::{SmallVec, smallvec};

use super::scope::{Entity, Kind, Places};
use super::{Lowered, Lowering};
use crate::circuit::ast::{Expression, Index, IndexKind, Name, Operand, Range};
use crate::circuit::diagnostic::{Diagnostic, Span};

/// What an operand means.
#[derive(Debug, Clone)]
pub struct Selected {
    /// The qubits or bits.
    pub items: SmallVec<[u32; 4]>,
    /// Whether it is one qubit or bit, which goes with every member of the
    /// registers beside it.
    pub single: bool,
}

impl<'a> Lowering<'a> {
    /// The qubits or bits an operand means.
    pub(super) fn select(&mut self, operand: &Operand<'a>, wanted: Kind) -> Lowered<Selected> {
        let (mut places, mut single) = match self.lookup(operand.name)? {
            Entity::Register {
                kind,
                places,
                single,
            } if kind == wanted => (places, single),
            entity => return Err(wrong_kind(operand.name, &entity, wanted).into()),
        };
        for index in &operand.indices {
            if single {
                return Err(Diagnostic::error(
                    index.span,
                    format!("`{}` is a single one and takes no index", operand.name.text),
                )
                .into());
            }
            (places, single) = self.indexed(&places, index, operand.name)?;
        }
        let count = places.len();
        self.budget.step(count as u64, operand.span)?;
        Ok(Selected {
            items: (0..count).map(|position| places.at(position)).collect(),
            single,
        })
    }

    /// What one pair of brackets picks.
    pub(super) fn indexed(
        &mut self,
        places: &Places,
        index: &Index<'a>,
        name: Name<'a>,
    ) -> Lowered<(Places, bool)> {
        let positions: SmallVec<[usize; 4]> = match &index.kind {
            IndexKind::Element(expression) => {
                let position = self.position(expression, places.len(), name)?;
                let run = Places::Run {
                    first: places.at(position),
                    count: 1,
                };
                return Ok((run, true));
            }
            IndexKind::Range(range) => {
                self.range_positions(range, places.len(), name, index.span)?
            }
            IndexKind::Set(elements) => self.set_positions(elements, places.len(), name)?,
        };
        if positions.is_empty() {
            return Err(Diagnostic::error(
                index.span,
                format!("this picks nothing from `{}`", name.text),
            )
            .with_help("a range includes both ends: [0:3] picks four")
            .into());
        }
        let list = positions.iter().map(|&position| places.at(position));
        Ok((Places::List(list.collect()), false))
    }

    /// A position from an index; negative ones count from the end.
    fn position(
        &mut self,
        expression: &Expression<'a>,
        length: usize,
        name: Name<'a>,
    ) -> Lowered<usize> {
        let index = self.integer(expression, "an index")?;
        self.within(index, length, name, expression.span)
    }

    fn within(&self, index: i128, length: usize, name: Name<'a>, place: Span) -> Lowered<usize> {
        let length = length as i128;
        if (-length..length).contains(&index) {
            return Ok(index.rem_euclid(length) as usize);
        }
        Err(Diagnostic::error(
            place,
            format!("index {index} is out of range for `{}`", name.text),
        )
        .with_help(if length == 1 {
            "it has one element, index 0".to_owned()
        } else {
            format!("it has {length} elements, indices 0 to {}", length - 1)
        })
        .into())
    }

    fn range_positions(
        &mut self,
        range: &Range<'a>,
        length: usize,
        name: Name<'a>,
        place: Span,
    ) -> Lowered<SmallVec<[usize; 4]>> {
        let step = match &range.step {
            Some(step) => self.integer(step, "the step of a range")?,
            None => 1,
        };
        if step == 0 {
            return Err(Diagnostic::error(place, "a range with step 0").into());
        }
        let mut end = |bound: &Option<Expression<'a>>, left_out: usize| match bound {
            Some(bound) => self.position(bound, length, name),
            None => Ok(left_out),
        };
        let (low, high) = (0, length - 1);
        let (start, end) = if step > 0 {
            (end(&range.start, low)?, end(&range.end, high)?)
        } else {
            (end(&range.start, high)?, end(&range.end, low)?)
        };
        let mut positions = SmallVec::new();
        let mut position = start as i128;
        while (step > 0 && position <= end as i128) || (step < 0 && position >= end as i128) {
            self.budget.step(1, place)?;
            positions.push(position as usize);
            position = position.saturating_add(step);
        }
        Ok(positions)
    }

    fn set_positions(
        &mut self,
        elements: &[Expression<'a>],
        length: usize,
        name: Name<'a>,
    ) -> Lowered<SmallVec<[usize; 4]>> {
        let mut positions = smallvec![];
        let mut seen = HashSet::new();
        for element in elements {
            let position = self.position(element, length, name)?;
            if !seen.insert(position) {
                return Err(Diagnostic::error(
                    element.span,
                    format!("element {position} of `{}` is picked twice", name.text),
                )
                .into());
            }
            positions.push(position);
        }
        Ok(positions)
    }
}

fn wrong_kind(name: Name<'_>, entity: &Entity, wanted: Kind) -> Diagnostic {
    let wanted = match wanted {
        Kind::Qubits => "qubits",
        Kind::Bits => "bits",
    };
    let error = Diagnostic::error(
        name.span,
        format!(
            "expected {wanted} here, but `{}` is {}",
            name.text,
            entity.kind()
        ),
    );
    match entity {
        Entity::Constant(_) => error.with_help("constants and loop variables cannot be written"),
        _ => error,
    }
}
