//! One term and its update rules; the formulas and names are those of the
//! module above.

use num_complex::Complex64;

use super::bits::Bits;
use super::matrix::Matrix;
use super::phase::{Diagonal, Factor};
use super::{QuadraticPhase, Stabiliser};

/// Everything of a term but its rows.
#[derive(Debug, Clone, Copy)]
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
        }
    }

    /// Whether the slot is no pivot and not shifted; with no row's bit there
    /// either, it is idle.
    pub(crate) fn is_plain_zero(&self, slot: usize) -> bool {
        !self.pivots.has(slot) && !self.shift.has(slot)
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
        let head = &*self.head;
        let pivots = head.pivots;
        let a = x & pivots;
        let (sum, quarters) = head.combine(&self.rows, a);

        let mut slope = z & pivots;
        let outside = z & !pivots;
        if !outside.is_zero() {
            slope ^= self.rows.odd_overlaps(pivots, outside);
        }
        let sign = (z & head.shift).parity() ^ (slope & a).parity();
        let e = (phase + quarters + 2 * u8::from(sign)) & 3;
        let lambda = slope ^ (sum & pivots);

        let d = (sum ^ x) & !pivots;
        if let Some(pivot) = d.lowest() {
            self.grow(pivot, d, lambda, e);
            true
        } else if e & 1 == 1 {
            self.head.factor.turn_eighths(if e == 1 { 1 } else { 7 });
            self.square(lambda, 4 - e);
            true
        } else {
            self.head.factor.double_halves(1);
            self.restrict(lambda, lambda.lowest(), e == 2)
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

    /// Keeps the points with λ·y = σ, amplitudes unchanged; `pivot`, a member
    /// of λ, leaves the parameters. Returns whether anything is left.
    #[inline(always)]
    fn restrict(&mut self, lambda: Bits<W>, pivot: Option<usize>, sigma: bool) -> bool {
        let Some(pivot) = pivot else {
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
        for (pair, (i, j)) in [(0, 1), (1, 2), (0, 2)].into_iter().enumerate() {
            if !phase.cz[pair] {
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

    /// Projects on Z_slot = (−1)^value and leaves the slot idle. Returns
    /// whether anything is left.
    #[inline(always)]
    pub(crate) fn measured(&mut self, slot: usize, value: bool) -> bool {
        let lambda = self.head.dependence(&self.rows, slot);
        let sigma = self.head.shift.has(slot) ^ value;
        let kept = self.restrict(lambda, lambda.lowest(), sigma);
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
