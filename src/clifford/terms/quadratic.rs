//! Signs that are quadratic in three bits.

use crate::magic::CczComponent;

/// A diagonal Clifford gate with entries ±1 on three slots.
///
/// On |x0 x1 x2⟩ it is (−1) to the number of: `negative`, x_i with `z[i]`,
/// x0·x1 with `cz[0]`, x1·x2 with `cz[1]`, x0·x2 with `cz[2]`.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Hash, Default)]
pub struct QuadraticPhase {
    /// Z on each of the slots.
    pub z: [bool; 3],
    /// CZ on the pairs (0, 1), (1, 2), (0, 2).
    pub cz: [bool; 3],
    /// A minus sign on everything.
    pub negative: bool,
}

/// The pairs of [`QuadraticPhase::cz`].
pub(crate) const PAIRS: [(usize, usize); 3] = [(0, 1), (1, 2), (0, 2)];

impl From<CczComponent> for QuadraticPhase {
    fn from(component: CczComponent) -> Self {
        let bits = |mask: u8| [0, 1, 2].map(|bit| mask >> bit & 1 == 1);
        QuadraticPhase {
            z: bits(component.z),
            cz: bits(component.cz),
            negative: component.negative,
        }
    }
}

impl QuadraticPhase {
    /// x → the sign at x ⊕ s: the gate between two X on the slots of s.
    pub fn flipped(self, s: [bool; 3]) -> Self {
        let mut flipped = self;
        for (i, &z) in self.z.iter().enumerate() {
            flipped.negative ^= z & s[i];
        }
        for ((i, j), cz) in PAIRS.into_iter().zip(self.cz) {
            flipped.z[i] ^= cz & s[j];
            flipped.z[j] ^= cz & s[i];
            flipped.negative ^= cz & s[i] & s[j];
        }
        flipped
    }

    /// Whether the entry of |x0 x1 x2⟩ is −1.
    pub fn is_negative(self, x: [bool; 3]) -> bool {
        let mut negative = self.negative;
        for (i, &z) in self.z.iter().enumerate() {
            negative ^= z & x[i];
        }
        for ((i, j), cz) in PAIRS.into_iter().zip(self.cz) {
            negative ^= cz & x[i] & x[j];
        }
        negative
    }
}

#[cfg(test)]
mod tests {
    use super::QuadraticPhase;
    use crate::magic::CczSite;

    fn bits(number: u32) -> [bool; 3] {
        [0, 1, 2].map(|i| number >> i & 1 == 1)
    }

    /// (1/6) Σ_b D_b(x) is −1 for x = 111 and 1 elsewhere: Quantum 3, 181 (2019).
    #[test]
    fn components_sum_to_ccz() {
        for x in 0..8 {
            let sum: i32 = (0..8)
                .map(|b| QuadraticPhase::from(CczSite::component(b)).is_negative(bits(x)))
                .map(|negative| if negative { -1 } else { 1 })
                .sum();
            assert_eq!(sum, if x == 7 { -6 } else { 6 });
        }
    }

    #[test]
    fn flipping_shifts_the_argument() {
        for code in 0..128 {
            let phase = QuadraticPhase {
                z: bits(code),
                cz: bits(code >> 3),
                negative: code >> 6 == 1,
            };
            for (s, x) in (0..8).flat_map(|s| (0..8).map(move |x| (s, x))) {
                assert_eq!(
                    phase.flipped(bits(s)).is_negative(bits(x)),
                    phase.is_negative(bits(s ^ x))
                );
            }
        }
    }
}
