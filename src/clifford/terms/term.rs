//! One term and its update rules; the formulas and names are those of the
//! module above.

use num_complex::Complex64;

use super::bits::Bits;
use super::matrix::Matrix;
use super::phase::{Diagonal, Factor};
use super::quadratic::{PAIRS, QuadraticPhase};
use crate::magic::Stabiliser;

/// Everything of a term but its rows.
#[derive(Debug, Clone, Copy, PartialEq)]
pub(crate) struct Head<const W: usize> {
    /// V, the slots whose basis bits are the parameters.
    pub(crate) pivots: Bits<W>,
    /// h, the shift; disjoint from the pivots.
    pub(crate) shift: Bits<W>,
    /// b mod 4, zero outside the pivots.
    pub(crate) diagonal: Diagonal<W>,
    /// ω.
    pub(crate) factor: Factor,
    /// Which original term this is.
    pub(crate) label: u32,
    /// How many factors 0 wait for their slot.
    pub(crate) blocked: u16,
    /// Of the candidate of the last sweep.
    pub(crate) gathered: Gathered<W>,
}

impl<const W: usize> Head<W> {
    /// weight·|0…0⟩.
    pub(crate) fn new(weight: Complex64, label: u32) -> Self {
        Self {
            pivots: Bits::ZERO,
            shift: Bits::ZERO,
            diagonal: Diagonal::ZERO,
            factor: Factor::new(weight),
            label,
            blocked: 0,
            gathered: Gathered::default(),
        }
    }

    /// L_s: the parameters the bit of this slot depends on.
    #[inline(always)]
    pub(crate) fn dependence(&self, rows: &Matrix<impl AsRef<[u64]>, W>, slot: usize) -> Bits<W> {
        if self.pivots.has(slot) {
            return Bits::one(slot);
        }
        rows.column(self.pivots, slot)
    }

    /// Σ_{p∈a} R_p and B(a) mod 4, for a ⊆ V.
    #[inline(always)]
    fn combine(&self, rows: &Matrix<impl AsRef<[u64]>, W>, a: Bits<W>) -> (Bits<W>, u8) {
        let (sum, pairs) = rows.combine(a);
        (sum, self.diagonal.total(a) ^ (u8::from(pairs) << 1))
    }

    /// ⟨x|φ⟩.
    pub(crate) fn amplitude(&self, rows: &Matrix<impl AsRef<[u64]>, W>, x: Bits<W>) -> Complex64 {
        let (sum, quarters) = self.combine(rows, x & self.pivots);
        if !((sum ^ x ^ self.shift) & !self.pivots).is_zero() {
            return Complex64::ZERO;
        }
        let size = self.pivots.weight() as i32;
        self.factor
            .times_halves(-size)
            .times_quarters(quarters)
            .value()
    }
}

/// What X^x does to a term: with a = x on the pivots, Σ_{p∈a} R_p and B(a).
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(crate) struct Gathered<const W: usize> {
    /// Σ_{p∈a} R_p.
    pub(crate) sum: Bits<W>,
    /// B(a) mod 4.
    pub(crate) quarters: u8,
}

/// A term being changed: head and rows. Only rows of pivots are ever read.
pub(crate) struct Term<'a, const W: usize> {
    /// The words.
    pub(crate) head: &'a mut Head<W>,
    /// R, one row a slot.
    pub(crate) rows: Matrix<&'a mut [u64], W>,
}

/// What replaces a parameter: k·y ⊕ σ, and what the parameter was.
struct Substitution<const W: usize> {
    /// k.
    form: Bits<W>,
    /// σ.
    offset: bool,
    /// m, its off-diagonal row.
    row: Bits<W>,
    /// b, its diagonal.
    quarters: u8,
    /// What the rows of k get besides m ⊕ (b mod 2)·k: the generator on plain
    /// slots, and the bits of slots that change their role.
    generator: Bits<W>,
    /// What the rows of m get besides k: bits of slots that change their role.
    moved: Bits<W>,
}

impl<const W: usize> Term<'_, W> {
    /// (1 + i^phase·X^x Z^z)/√2. Returns whether anything is left.
    #[inline(always)]
    pub(crate) fn primitive(&mut self, phase: u8, x: Bits<W>, z: Bits<W>) -> bool {
        let gathered = self.gather(x);
        self.primitive_gathered(phase, x, z, gathered)
    }

    /// What the rows say of X^x.
    #[inline(always)]
    pub(crate) fn gather(&self, x: Bits<W>) -> Gathered<W> {
        let (sum, quarters) = self.head.combine(&self.rows, x & self.head.pivots);
        Gathered { sum, quarters }
    }

    /// X^x; afterwards `gathered` is that of the new state.
    #[inline(always)]
    pub(crate) fn shift_by(&mut self, x: Bits<W>, gathered: &mut Gathered<W>) {
        let head = &mut *self.head;
        // B(y ⊕ a) = B(y) + B(a) + 2·y·B̂a, and B(a) becomes −B(a).
        head.shift ^= (gathered.sum ^ x) & !head.pivots;
        head.diagonal.high ^= gathered.sum & head.pivots;
        head.factor.turn_quarters(gathered.quarters);
        gathered.quarters = gathered.quarters.wrapping_neg() & 3;
    }

    /// The same as [`Self::primitive`], the rows in x summed up already.
    #[inline(always)]
    pub(crate) fn primitive_gathered(
        &mut self,
        phase: u8,
        x: Bits<W>,
        z: Bits<W>,
        gathered: Gathered<W>,
    ) -> bool {
        let head = &*self.head;
        let pivots = head.pivots;
        let a = x & pivots;
        let Gathered { sum, quarters } = gathered;

        let mut slope = z & pivots;
        let outside = z & !pivots;
        if !outside.is_zero() {
            slope ^= self.rows.odd_overlaps(pivots, outside);
        }
        let sign = (z & head.shift).parity() ^ (slope & a).parity();
        let e = (phase + quarters + 2 * u8::from(sign)) & 3;
        let lambda = slope ^ (sum & pivots);

        let d = (sum ^ x) & !pivots;
        // The lowest: passes go up to the last pivot.
        if let Some(pivot) = d.lowest() {
            self.grow(pivot, d, lambda, e);
            true
        } else if e & 1 == 1 {
            self.head.factor.turn_eighths(if e == 1 { 1 } else { 7 });
            self.square(lambda, 4 - e);
            true
        } else {
            self.head.factor.double_halves(1);
            self.restrict(lambda, e == 2)
        }
    }

    /// Adds a parameter at plain slot `pivot` with generator d (which has that
    /// bit), row m and diagonal b.
    #[inline(always)]
    fn grow(&mut self, pivot: usize, d: Bits<W>, m: Bits<W>, b: u8) {
        let here = Bits::one(pivot);
        let form = self.head.dependence(&self.rows, pivot) | here;
        let offset = self.head.shift.has(pivot);
        self.head.shift ^= d.when(offset);
        self.head.pivots |= here;
        // The bit the generator will take from it.
        self.rows.set_row(pivot, here);
        self.substitute(&Substitution {
            form,
            offset,
            row: m,
            quarters: b,
            // The old bits at the pivot, those of the generators, go.
            generator: d,
            moved: Bits::ZERO,
        });
    }

    /// Keeps the points with λ·y = σ, amplitudes unchanged; a member of λ
    /// leaves the parameters. Returns whether anything is left.
    #[inline(always)]
    fn restrict(&mut self, lambda: Bits<W>, sigma: bool) -> bool {
        // The highest: passes go up to the last pivot.
        let Some(pivot) = lambda.highest() else {
            return !sigma;
        };
        let here = Bits::one(pivot);
        let row = self.rows.row(pivot);
        let quarters = self.head.diagonal.take(pivot);
        let generator = (row & !self.head.pivots) | here;
        self.head.shift ^= generator.when(sigma);
        self.head.pivots &= !here;
        let m = row & self.head.pivots;
        self.head.factor.double_halves(-1);
        self.substitute(&Substitution {
            form: lambda & !here,
            offset: sigma,
            row: m,
            quarters,
            generator,
            // Where the pair with the old parameter stood, a generator bit will.
            moved: here,
        });
        true
    }

    /// Adds b·[L·y] to the quadratic form.
    #[inline(always)]
    fn square(&mut self, form: Bits<W>, b: u8) {
        if b & 1 == 1 {
            self.rows.add((form, form), (Bits::ZERO, Bits::ZERO));
        }
        self.head.diagonal.add(b, form);
    }

    /// Replaces a parameter that has been taken out of the diagonal (its pairs
    /// stand in `row` and, until `moved` is added, in the rows of `row`).
    #[inline(always)]
    fn substitute(&mut self, s: &Substitution<W>) {
        let on_form = s.generator ^ s.row ^ s.form.when(s.quarters & 1 == 1);
        self.rows.add((s.form, on_form), (s.row, s.form ^ s.moved));
        let diagonal = &mut self.head.diagonal;
        diagonal.substitute(s.quarters, s.offset, s.form, s.row);
        if s.offset {
            self.head.factor.turn_quarters(s.quarters);
        }
    }

    /// Whether the slot is in |0⟩, in a product with everything else.
    pub(crate) fn is_idle(&self, slot: usize) -> bool {
        !self.head.shift.has(slot) && self.head.dependence(&self.rows, slot).is_zero()
    }

    /// Turns idle |0⟩ into a stabiliser state.
    #[inline(always)]
    pub(crate) fn prepare(&mut self, slot: usize, state: Stabiliser) {
        let here = Bits::one(slot);
        let quarters = match state {
            Stabiliser::Zero => return,
            Stabiliser::One => {
                self.head.shift |= here;
                return;
            }
            Stabiliser::Plus => 0,
            Stabiliser::PlusI => 1,
            Stabiliser::Minus => 2,
            Stabiliser::MinusI => 3,
        };
        self.head.pivots |= here;
        self.rows.set_row(slot, here.when(quarters & 1 == 1));
        self.head.diagonal.add(quarters, here);
    }

    /// diag(1, i^power) on a slot.
    #[inline(always)]
    pub(crate) fn diagonal(&mut self, slot: usize, power: u8) {
        let power = power & 3;
        if power == 0 {
            return;
        }
        if self.head.shift.has(slot) {
            self.head.factor.turn_quarters(power);
            self.square(self.head.dependence(&self.rows, slot), 4 - power);
        } else {
            self.square(self.head.dependence(&self.rows, slot), power);
        }
    }

    /// Signs by up to three bits and their pairs.
    #[inline(always)]
    pub(crate) fn quadratic(&mut self, slots: [usize; 3], phase: QuadraticPhase) {
        let forms = slots.map(|slot| self.head.dependence(&self.rows, slot));
        let offsets = slots.map(|slot| self.head.shift.has(slot));
        let mut sign = phase.negative;
        for i in 0..3 {
            if phase.z[i] {
                self.head.diagonal.high ^= forms[i];
                sign ^= offsets[i];
            }
        }
        for ((i, j), cz) in PAIRS.into_iter().zip(phase.cz) {
            if !cz {
                continue;
            }
            self.rows.add((forms[i], forms[j]), (forms[j], forms[i]));
            self.head.diagonal.high ^=
                (forms[i] & forms[j]) ^ forms[i].when(offsets[j]) ^ forms[j].when(offsets[i]);
            sign ^= offsets[i] & offsets[j];
        }
        self.head.factor.turn_quarters(2 * u8::from(sign));
    }

    /// Exchanges |0⟩ and |1⟩ of a slot.
    #[inline(always)]
    pub(crate) fn flip(&mut self, slot: usize) {
        let head = &mut *self.head;
        if !head.pivots.has(slot) {
            head.shift ^= Bits::one(slot);
            return;
        }
        let row = self.rows.row(slot);
        head.shift ^= row & !head.pivots;
        let quarters = head.diagonal.at(slot);
        head.factor.turn_quarters(quarters);
        head.diagonal.high ^= row & head.pivots;
    }

    /// Projects on Z_slot = (−1)^value; the slot stays in use. Returns whether
    /// anything is left.
    #[inline(always)]
    pub(crate) fn project(&mut self, slot: usize, value: bool) -> bool {
        let lambda = self.head.dependence(&self.rows, slot);
        let sigma = self.head.shift.has(slot) ^ value;
        self.restrict(lambda, sigma)
    }

    /// Projects on Z_slot = (−1)^value and leaves the slot idle. Returns
    /// whether anything is left.
    #[inline(always)]
    pub(crate) fn measured(&mut self, slot: usize, value: bool) -> bool {
        let kept = self.project(slot, value);
        self.head.shift &= !Bits::one(slot);
        kept
    }

    /// Adds the control's bit to the target's.
    #[inline(always)]
    pub(crate) fn controlled_not(&mut self, control: usize, target: usize) {
        if self.head.pivots.has(target) {
            let form = self.head.dependence(&self.rows, control);
            if !form.has(target) {
                self.shift_pivot(target, form, self.head.shift.has(control));
                return;
            }
            self.exchange(target, control, form);
        }
        let there = Bits::one(target);
        let form = self.head.dependence(&self.rows, control);
        self.rows.add((form, there), (Bits::ZERO, Bits::ZERO));
        self.head.shift ^= there.when(self.head.shift.has(control));
    }

    /// The bit of a pivot becomes x_j ⊕ k·y ⊕ σ, k without j.
    fn shift_pivot(&mut self, pivot: usize, form: Bits<W>, sigma: bool) {
        let here = Bits::one(pivot);
        let row = self.rows.row(pivot);
        let quarters = self.head.diagonal.take(pivot);
        let generator = row & !self.head.pivots;
        self.head.shift ^= generator.when(sigma);
        self.rows.set_row(pivot, Bits::ZERO);
        self.substitute(&Substitution {
            form: form | here,
            offset: sigma,
            row: row & self.head.pivots & !here,
            quarters,
            generator,
            // The old pairs stay where the new ones go.
            moved: here,
        });
    }

    /// Makes plain slot `new` a pivot instead of `old`; `form` is L_new, and
    /// has `old`.
    fn exchange(&mut self, old: usize, new: usize, form: Bits<W>) {
        let (there, here) = (Bits::one(old), Bits::one(new));
        let row = self.rows.row(old);
        let quarters = self.head.diagonal.take(old);
        let generator = (row & !self.head.pivots) | there;
        let offset = self.head.shift.has(new);
        self.head.shift ^= generator.when(offset);
        let m = row & self.head.pivots & !there;
        self.head.pivots = (self.head.pivots & !there) | here;
        self.rows.set_row(new, here);
        self.substitute(&Substitution {
            form: (form & !there) | here,
            offset,
            row: m,
            quarters,
            generator,
            moved: there,
        });
    }
}
