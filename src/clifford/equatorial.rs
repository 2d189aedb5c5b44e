//! Overlaps of terms with random equatorial states.
//!
//! An equatorial state on r slots is |θ⟩ = 2^{-r/2} Σ_x i^{A(x)}|x⟩ with
//! A(x) = Σ_q a_q x_q + 2 Σ_{q<q'} A_qq' x_q x_q' (mod 4). For uniformly random
//! A the mean of 2^r·|⟨θ|φ⟩|² is ‖φ‖²: fast norm estimation, Phys. Rev. Lett.
//! 116, 250501 (2016) and Quantum 3, 181 (2019).
//!
//! With a term in the affine form of [`terms`](super::terms),
//!
//! ```text
//! ⟨θ|φ⟩ = ω 2^{-(r+|V|)/2} Σ_y i^{B(y) − A(h ⊕ Ky)},
//! B(y) − A(h ⊕ Ky) = −A(h) + Σ_p y_p (b_p − A(K_p) − 2 h·ÂK_p)
//!                    + 2 Σ_{p<q} y_p y_q (B_pq − K_p·ÂK_q)
//! ```
//!
//! (Â: the matrix A_qq' with a_q mod 2 on the diagonal): a sum over a
//! Z₄-valued form, done variable by variable. With b and m the
//! diagonal and row of the next variable,
//!
//! - b odd: (1 + i^b(−1)^{m·y}) = √2·e^{±iπ/4}·i^{−b[m·y]}, a square;
//! - b even, m ≠ 0: twice the sum over m·y = b/2, a substitution;
//! - b even, m = 0: 2 or 0.
//!
//! Fixing a slot to 0 or 1 is a linear condition with right side 0 or 1. From
//! there on the two sums differ in ⌊b/2⌋ and the phase only: never in b mod 2 or
//! in the pairs. So both are done together, as two *lanes*.

#[cfg(test)]
mod tests;

use num_complex::Complex64;
use rand::Rng;

use super::kernels::kernel;
use super::terms::bits::Bits;
use super::terms::matrix::Matrix;
use super::terms::phase::Diagonal;
use super::terms::term::Head;
use super::terms::{Mask, Terms};

/// A random equatorial state on the active slots; the others are |0⟩.
#[derive(Debug, Clone)]
pub struct EquatorialForm<const W: usize> {
    active: Bits<W>,
    diagonal: Diagonal<W>,
    /// Â: row q has the bits q' with A_qq' odd, and bit q if a_q is. Only rows
    /// of active slots are read.
    rows: Matrix<Vec<u64>, W>,
}

impl<const W: usize> EquatorialForm<W> {
    /// A form for up to this many slots, for now without active ones.
    ///
    /// # Panics
    ///
    /// If there are more than 64·W slots.
    pub fn new(slots: usize) -> Self {
        assert!(
            slots <= 64 * W,
            "{slots} slots do not fit into {W} words of 64"
        );
        Self {
            active: Bits::ZERO,
            diagonal: Diagonal::ZERO,
            rows: Matrix::zero(slots),
        }
    }

    /// Draws a new form on these slots: a_q uniform mod 4, A_qq' mod 2.
    /// Memory is used again.
    ///
    /// # Panics
    ///
    /// If a slot is not below the capacity.
    pub fn randomise<R: Rng + ?Sized>(&mut self, active: &Mask<W>, rng: &mut R) {
        self.fill(active, |used| {
            let draw = |word| if word == 0 { 0 } else { word & rng.next_u64() };
            Bits(used.0.map(draw))
        });
    }

    /// Sets the form from a source of words; it is told which bits are used.
    fn fill(&mut self, active: &Mask<W>, mut words: impl FnMut(Bits<W>) -> Bits<W>) {
        self.active = Bits(*active);
        self.diagonal = Diagonal {
            low: words(self.active),
            high: words(self.active),
        };
        let mut below = Bits::ZERO;
        for q in self.active.ones() {
            let row = words(below);
            let here = Bits::one(q);
            self.rows.set_row(q, row | (here & self.diagonal.low));
            self.rows.add((row, here), (Bits::ZERO, Bits::ZERO));
            below |= here;
        }
    }

    /// The active slots.
    pub fn active(&self) -> Mask<W> {
        self.active.0
    }

    /// A(x) mod 4; bits of x on slots that are not active do not count.
    pub fn value(&self, x: &Mask<W>) -> u8 {
        self.image(Bits(*x) & self.active).1
    }

    /// Âx and A(x) mod 4, for x on active slots.
    #[inline(always)]
    fn image(&self, x: Bits<W>) -> (Bits<W>, u8) {
        let (image, pairs) = self.rows.combine(x);
        (image, self.diagonal.total(x) ^ (u8::from(pairs) << 1))
    }

    /// The same for e_p ⊕ x, bit by bit: for an x of few bits.
    #[inline(always)]
    fn image_of_few(&self, p: usize, x: Bits<W>) -> (Bits<W>, u8) {
        let mut image = self.rows.row(p);
        let mut pairs = false;
        for q in x.ones() {
            pairs ^= image.has(q);
            image ^= self.rows.row(q);
        }
        let quarters = self.diagonal.total(x | Bits::one(p));
        (image, quarters ^ (u8::from(pairs) << 1))
    }
}

impl<const W: usize> Terms<W> {
    /// Σ over the terms φ of ⟨θ|Π_m φ⟩ for m = 0 and 1, where Π_m projects the
    /// slot on |m⟩. Every slot that is not active in the form must be idle.
    ///
    /// # Panics
    ///
    /// If the slot or an active slot of the form is not below the capacity.
    pub fn overlaps(&self, form: &EquatorialForm<W>, slot: usize) -> [Complex64; 2] {
        assert!(
            slot < self.slots() && (form.active & !Bits::first(self.slots())).is_zero(),
            "a slot is not below the capacity {}",
            self.slots()
        );
        let mut scratch = Scratch::new(self.slots());
        all_overlaps(self.level(), self, form, slot, &mut scratch)
    }
}

kernel! {
    /// The sums over all terms, compiled for every level.
    fn all_overlaps<W>(
        terms: &Terms<W>,
        form: &EquatorialForm<W>,
        slot: usize,
        scratch: &mut Scratch<W>,
    ) -> [Complex64; 2] = sum_of_overlaps;
}

#[inline(always)]
fn sum_of_overlaps<const W: usize>(
    terms: &Terms<W>,
    form: &EquatorialForm<W>,
    slot: usize,
    scratch: &mut Scratch<W>,
) -> [Complex64; 2] {
    let mut sums = [Complex64::ZERO; 2];
    for (head, rows) in terms.views() {
        let values = scratch.overlap(form, head, &rows, slot);
        sums[0] += values[0];
        sums[1] += values[1];
    }
    sums
}

/// Working space of one overlap: a Z₄-valued form in two lanes.
struct Scratch<const W: usize> {
    /// Pairs of parameters.
    rows: Matrix<Vec<u64>, W>,
    /// For a plain slot n: the parameters p with n in K_p.
    columns: Vec<Bits<W>>,
    /// Parameters not summed over yet.
    left: Bits<W>,
    lanes: [Lane<W>; 2],
    /// The power of √2 common to both lanes.
    halves: i32,
}

/// What differs between the two sums.
#[derive(Debug, Clone, Copy)]
struct Lane<const W: usize> {
    diagonal: Diagonal<W>,
    eighths: u8,
    zero: bool,
}

impl<const W: usize> Scratch<W> {
    fn new(slots: usize) -> Self {
        let lane = Lane {
            diagonal: Diagonal::ZERO,
            eighths: 0,
            zero: false,
        };
        Self {
            rows: Matrix::zero(slots),
            columns: vec![Bits::ZERO; slots],
            left: Bits::ZERO,
            lanes: [lane; 2],
            halves: 0,
        }
    }

    /// ⟨θ|Π_m φ⟩ for m = 0 and 1.
    #[inline(always)]
    fn overlap(
        &mut self,
        form: &EquatorialForm<W>,
        head: &Head<W>,
        rows: &Matrix<&[u64], W>,
        slot: usize,
    ) -> [Complex64; 2] {
        debug_assert!(((head.pivots | head.shift) & !form.active).is_zero());
        self.pull_back(form, head, rows);
        let condition = head.dependence(rows, slot);
        let offset = head.shift.has(slot);
        self.restrict(condition, [offset, !offset]);
        self.sum();
        self.lanes.map(|lane| {
            if lane.zero {
                return Complex64::ZERO;
            }
            head.factor
                .times_halves(self.halves)
                .times_eighths(lane.eighths)
                .value()
        })
    }

    /// Sets up B(y) − A(h ⊕ Ky), the same in both lanes.
    #[inline(always)]
    fn pull_back(&mut self, form: &EquatorialForm<W>, head: &Head<W>, rows: &Matrix<&[u64], W>) {
        let pivots = head.pivots;
        let plain = form.active & !pivots;
        for n in plain.ones() {
            self.columns[n] = rows.column(pivots, n);
        }
        let mut diagonal = head.diagonal;
        for p in pivots.ones() {
            let here = Bits::one(p);
            let row = rows.row(p);
            let (image, value) = form.image_of_few(p, row & plain);
            let mut pairs = (row ^ image) & pivots;
            for n in (image & plain).ones() {
                pairs ^= self.columns[n];
            }
            self.rows.set_row(p, pairs);
            let sign = (image & head.shift).parity();
            diagonal.add((8 - value - 2 * u8::from(sign)) & 3, here);
        }
        let constant = form.image(head.shift).1;
        let lane = Lane {
            diagonal,
            eighths: (8 - 2 * constant) & 7,
            zero: false,
        };
        self.lanes = [lane; 2];
        self.left = pivots;
        self.halves = -((form.active.weight() + pivots.weight()) as i32);
    }

    /// Keeps the points with λ·y = σ, σ by lane.
    #[inline(always)]
    fn restrict(&mut self, lambda: Bits<W>, sigma: [bool; 2]) {
        let Some(variable) = lambda.highest() else {
            for (lane, sigma) in self.lanes.iter_mut().zip(sigma) {
                lane.zero |= sigma;
            }
            return;
        };
        let others = !Bits::one(variable);
        self.left &= others;
        let k = lambda & others;
        let m = self.rows.row(variable) & self.left;
        let odd = self.lanes[0].diagonal.low.has(variable);
        // Bits of variables already summed over are never read: no need to
        // take them out of the rows.
        self.rows.add((k, m ^ k.when(odd)), (m, k));
        for (lane, sigma) in self.lanes.iter_mut().zip(sigma) {
            let b = lane.diagonal.take(variable);
            lane.diagonal.substitute(b, sigma, k, m);
            if sigma {
                lane.eighths = lane.eighths.wrapping_add(2 * b);
            }
        }
    }

    /// Sums over everything that is left.
    #[inline(always)]
    fn sum(&mut self) {
        // From the highest on, so that the rows to be changed become fewer.
        while let Some(variable) = self.left.highest() {
            self.left &= !Bits::one(variable);
            let m = self.rows.row(variable) & self.left;
            if self.lanes[0].diagonal.low.has(variable) {
                self.halves += 1;
                for lane in &mut self.lanes {
                    let b = lane.diagonal.take(variable);
                    lane.eighths = lane.eighths.wrapping_add(if b == 1 { 1 } else { 7 });
                    lane.diagonal.add(4 - b, m);
                }
                self.rows.add((m, m), (Bits::ZERO, Bits::ZERO));
            } else {
                self.halves += 2;
                let sigma = [0, 1].map(|i| self.lanes[i].diagonal.high.has(variable));
                self.restrict(m, sigma);
            }
        }
    }
}
