//! Many operations in one pass over the terms.
//!
//! A term is a few hundred bytes; to fetch it costs as much as to change it. So
//! operations are collected and done one after the other on each term while it
//! is in the first cache. A pass ends by gathering the rows of the next
//! primitive's X part: this gives the amplitude at |x⟩, for the sums, and is kept
//! with the term, for the primitive itself in the next pass needs the same rows.

use num_complex::Complex64;

use super::Terms;
use super::bits::Bits;
use super::matrix::Matrix;
use super::operation::{Candidate, Operation, Planes, Resolved, Sums};
use super::term::{Gathered, Head, Term};
use crate::clifford::kernels::kernel;

/// What a sweep does.
struct Work<'a, const W: usize> {
    resolved: Option<Resolved<W>>,
    operations: &'a [Operation<W>],
    planes: Planes<'a>,
    candidate: Option<Candidate<W>>,
}

impl<const W: usize> Terms<W> {
    /// Does a primitive that was a candidate before and then the operations;
    /// drops the terms that become 0. Then sums the amplitudes at |0…0⟩ and, if
    /// there is a next candidate, at its |x⟩.
    ///
    /// # Panics
    ///
    /// On a slot that is not below the capacity or a plane that is not there.
    pub fn sweep(
        &mut self,
        resolved: Option<Resolved<W>>,
        operations: &[Operation<W>],
        planes: Planes<'_>,
        candidate: Option<Candidate<W>>,
    ) -> Sums {
        for operation in operations {
            self.check_operation(operation);
        }
        let reach = Bits::first(self.slots);
        for Candidate { x, z, .. } in resolved.iter().map(|r| &r.candidate).chain(&candidate) {
            assert!(
                ((Bits(*x) | Bits(*z)) & !reach).is_zero(),
                "the operator reaches beyond the capacity of {} slots",
                self.slots
            );
        }
        let level = self.level;
        sweep(
            level,
            self,
            &Work {
                resolved,
                operations,
                planes,
                candidate,
            },
        )
    }

    /// Writes down every term's amplitude at |0…0⟩, by label; 0 for terms that
    /// were dropped.
    pub fn amplitudes_at_zero(&self, by_label: &mut [Complex64]) {
        by_label.fill(Complex64::ZERO);
        for head in &self.heads {
            by_label[head.label as usize] = head.amplitude_at(Bits::ZERO, 0);
        }
    }

    fn check_operation(&self, operation: &Operation<W>) {
        match *operation {
            Operation::Plus { slot }
            | Operation::Prepare { slot, .. }
            | Operation::Diagonal { slot, .. }
            | Operation::Flip { slot }
            | Operation::Project { slot, .. }
            | Operation::Measured { slot, .. } => self.check(slot),
            Operation::ControlledNot { control, target } => {
                self.check(control);
                self.check(target);
                assert_ne!(control, target, "control and target are the same slot");
            }
            Operation::Quadratic { slots, .. } => slots.into_iter().for_each(|s| self.check(s)),
            Operation::Primitive { x, z, .. } => assert!(
                ((Bits(x) | Bits(z)) & !Bits::first(self.slots)).is_zero(),
                "the operator reaches beyond the capacity of {} slots",
                self.slots
            ),
            Operation::Phase { .. } | Operation::Scale(_) => {}
        }
    }
}

kernel! {
    /// The pass, compiled for every level.
    fn sweep<W>(terms: &mut Terms<W>, work: &Work<'_, W>) -> Sums = pass;
}

#[inline(always)]
fn pass<const W: usize>(terms: &mut Terms<W>, work: &Work<'_, W>) -> Sums {
    let words = terms.words();
    let stride = terms.stride;
    let mut kept = 0;
    let mut sums = Sums::default();
    for index in 0..terms.heads.len() {
        let start = index * words;
        let mut term = Term {
            head: &mut terms.heads[index],
            rows: Matrix::new(&mut terms.rows[start..start + words], stride),
        };
        if !change(&mut term, work) {
            continue;
        }
        sums.here += term.head.amplitude_at(Bits::ZERO, 0);
        if let Some(candidate) = &work.candidate {
            let x = Bits(candidate.x);
            let gathered = term.gather(x);
            let d = (gathered.sum ^ x) & !term.head.pivots;
            sums.there += term.head.amplitude_at(d, gathered.quarters);
            term.head.gathered = gathered;
        }
        if kept != index {
            terms.heads[kept] = terms.heads[index];
            terms.rows.copy_within(start..start + words, kept * words);
        }
        kept += 1;
    }
    terms.heads.truncate(kept);
    sums
}

/// Whether anything is left of the term.
#[inline(always)]
fn change<const W: usize>(term: &mut Term<'_, W>, work: &Work<'_, W>) -> bool {
    if let Some(Resolved { candidate, moved }) = &work.resolved {
        let (x, z) = (Bits(candidate.x), Bits(candidate.z));
        let mut phase = candidate.phase;
        let mut gathered = term.head.gathered;
        if *moved {
            term.shift_by(x, &mut gathered);
            phase = (phase + 2 * u8::from((x & z).parity())) & 3;
        }
        if !term.primitive_gathered(phase, x, z, gathered) {
            return false;
        }
    }
    // No closure: it would be compiled apart, for every processor.
    for operation in work.operations {
        if !operate(term, operation, &work.planes) {
            return false;
        }
    }
    true
}

#[inline(always)]
fn operate<const W: usize>(
    term: &mut Term<'_, W>,
    operation: &Operation<W>,
    planes: &Planes<'_>,
) -> bool {
    let label = term.head.label;
    match operation {
        Operation::Plus { slot } => term.prepare(*slot, crate::magic::Stabiliser::Plus),
        Operation::Prepare { slot, release } => {
            let release = release.of(planes, label);
            term.head.factor.multiply(release.factor);
            term.head.blocked -= u16::from(release.unblock);
            term.prepare(*slot, release.state);
        }
        Operation::ControlledNot { control, target } => term.controlled_not(*control, *target),
        Operation::Diagonal { slot, turn } => {
            let turn = turn.of(planes, label);
            term.head.factor.turn_eighths(turn.eighths);
            term.diagonal(*slot, turn.power);
        }
        Operation::Phase { eighths } => {
            let eighths = eighths.of(planes, label);
            term.head.factor.turn_eighths(eighths);
        }
        Operation::Quadratic { slots, phase } => {
            let phase = phase.of(planes, label);
            term.quadratic(*slots, phase);
        }
        Operation::Primitive { phase, x, z } => {
            return term.primitive(*phase & 3, Bits(*x), Bits(*z));
        }
        Operation::Flip { slot } => term.flip(*slot),
        Operation::Project { slot, value, when } => {
            if when.of(planes, label) {
                return term.project(*slot, *value);
            }
        }
        Operation::Measured { slot, value } => return term.measured(*slot, *value),
        Operation::Scale(factor) => term.head.factor.scale((*factor).into()),
    }
    true
}

impl<const W: usize> Head<W> {
    /// ⟨u|φ⟩ for a point whose parameters give B = `quarters` and whose plain
    /// bits differ from theirs by d ⊕ h.
    #[inline(always)]
    pub(super) fn amplitude_at(&self, d: Bits<W>, quarters: u8) -> Complex64 {
        if self.blocked > 0 || !(self.shift ^ d).is_zero() {
            return Complex64::ZERO;
        }
        let size = self.pivots.weight() as i32;
        self.factor
            .times_halves(-size)
            .times_quarters(quarters)
            .value()
    }
}

impl<const W: usize> Default for Gathered<W> {
    fn default() -> Self {
        Gathered {
            sum: Bits::ZERO,
            quarters: 0,
        }
    }
}
