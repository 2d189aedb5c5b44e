//! Exact phases: the diagonal of a Z₄-valued form in two bit planes, and ω as
//! a weight times powers of √2 and e^{iπ/4}.

use std::f64::consts::{FRAC_1_SQRT_2, SQRT_2};

use num_complex::Complex64;

use super::bits::Bits;

/// b_p mod 4 for every slot p.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(crate) struct Diagonal<const W: usize> {
    /// b_p mod 2.
    pub(crate) low: Bits<W>,
    /// ⌊b_p/2⌋.
    pub(crate) high: Bits<W>,
}

impl<const W: usize> Diagonal<W> {
    /// All 0.
    pub(crate) const ZERO: Self = Self {
        low: Bits::ZERO,
        high: Bits::ZERO,
    };

    /// b_p.
    #[inline(always)]
    pub(crate) fn at(&self, slot: usize) -> u8 {
        u8::from(self.low.has(slot)) + 2 * u8::from(self.high.has(slot))
    }

    /// b_p, which becomes 0.
    #[inline(always)]
    pub(crate) fn take(&mut self, slot: usize) -> u8 {
        let value = self.at(slot);
        let others = !Bits::one(slot);
        self.low &= others;
        self.high &= others;
        value
    }

    /// Σ_{p∈a} b_p mod 4.
    #[inline(always)]
    pub(crate) fn total(&self, a: Bits<W>) -> u8 {
        (((a & self.low).weight() + 2 * (a & self.high).weight()) & 3) as u8
    }

    /// b_p += quarters (mod 4) for p ∈ `slots`.
    #[inline(always)]
    pub(crate) fn add(&mut self, quarters: u8, slots: Bits<W>) {
        let odd = slots.when(quarters & 1 == 1);
        self.high ^= (self.low & odd) ^ slots.when(quarters & 2 == 2);
        self.low ^= odd;
    }

    /// The diagonal part of replacing a parameter with diagonal b and row m by
    /// k·y ⊕ σ, without the constant bσ.
    #[inline(always)]
    pub(crate) fn substitute(&mut self, b: u8, sigma: bool, k: Bits<W>, m: Bits<W>) {
        self.add(if sigma { b.wrapping_neg() & 3 } else { b }, k);
        self.high ^= (k & m) ^ m.when(sigma);
    }
}

/// weight · √2^halves · e^{iπ/4·eighths}.
#[derive(Debug, Clone, Copy, PartialEq)]
pub(crate) struct Factor {
    weight: Complex64,
    halves: i32,
    eighths: u8,
}

impl Factor {
    pub(crate) fn new(weight: Complex64) -> Self {
        Self {
            weight,
            halves: 0,
            eighths: 0,
        }
    }

    /// × √2^halves.
    #[inline(always)]
    pub(crate) fn double_halves(&mut self, halves: i32) {
        self.halves += halves;
    }

    /// × e^{iπ/4·eighths}.
    #[inline(always)]
    pub(crate) fn turn_eighths(&mut self, eighths: u8) {
        self.eighths = self.eighths.wrapping_add(eighths) & 7;
    }

    /// × i^quarters.
    #[inline(always)]
    pub(crate) fn turn_quarters(&mut self, quarters: u8) {
        self.turn_eighths(2 * (quarters & 3));
    }

    pub(crate) fn times_halves(mut self, halves: i32) -> Self {
        self.double_halves(halves);
        self
    }

    pub(crate) fn times_eighths(mut self, eighths: u8) -> Self {
        self.turn_eighths(eighths);
        self
    }

    pub(crate) fn times_quarters(mut self, quarters: u8) -> Self {
        self.turn_quarters(quarters);
        self
    }

    /// × number.
    #[inline(always)]
    pub(crate) fn multiply(&mut self, number: Complex64) {
        self.weight *= number;
    }

    /// × number; the powers of √2 are folded in, so that a caller who
    /// normalises now and then meets no overflow.
    pub(crate) fn scale(&mut self, number: Complex64) {
        self.weight *= number * root_two_power(self.halves);
        self.halves = 0;
    }

    /// The number itself.
    #[inline(always)]
    pub(crate) fn value(&self) -> Complex64 {
        self.weight * root_two_power(self.halves) * eighth_root(self.eighths)
    }

    /// |number|².
    pub(crate) fn norm_squared(&self) -> f64 {
        let size = root_two_power(self.halves);
        (self.weight * size).norm_sqr()
    }
}

/// √2^n; 0 or infinite where the result has no double.
#[inline(always)]
fn root_two_power(n: i32) -> f64 {
    let odd = if n & 1 == 1 { SQRT_2 } else { 1.0 };
    let power = n >> 1;
    if (-1022..=1023).contains(&power) {
        odd * f64::from_bits(((power + 1023) as u64) << 52)
    } else {
        odd * out_of_range(power)
    }
}

/// 2^power where that is no normal number. Apart, for a call of `powi` would be made
/// in advance even where it is not needed.
#[cold]
#[inline(never)]
fn out_of_range(power: i32) -> f64 {
    2f64.powi(power)
}

/// e^{iπ/4·n}, n from 0 to 7.
#[inline(always)]
fn eighth_root(n: u8) -> Complex64 {
    const H: f64 = FRAC_1_SQRT_2;
    const REAL: [f64; 8] = [1.0, H, 0.0, -H, -1.0, -H, 0.0, H];
    let n = usize::from(n & 7);
    Complex64::new(REAL[n], REAL[(n + 6) & 7])
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn powers_and_roots_are_exact() {
        for n in -2000..2000 {
            let exact = 2f64.powf(f64::from(n) / 2.0);
            assert!((root_two_power(n) / exact - 1.0).abs() < 1e-13, "{n}");
        }
        assert_eq!(root_two_power(-5000), 0.0);
        for n in 0..8u8 {
            let angle = std::f64::consts::FRAC_PI_4 * f64::from(n);
            let exact = Complex64::from_polar(1.0, angle);
            assert!((eighth_root(n) - exact).norm() < 1e-15);
        }
    }

    #[test]
    fn planes_add_modulo_four() {
        for start in 0..4 {
            for more in 0..4 {
                let mut diagonal = Diagonal::<1>::ZERO;
                diagonal.add(start, Bits::one(5));
                diagonal.add(more, Bits::one(5) | Bits::one(6));
                assert_eq!(diagonal.at(5), (start + more) % 4);
                assert_eq!(
                    diagonal.total(Bits::one(5) | Bits::one(6)),
                    (start + 2 * more) % 4
                );
                assert_eq!(diagonal.take(6), more);
                assert_eq!(diagonal.at(6), 0);
            }
        }
    }
}
