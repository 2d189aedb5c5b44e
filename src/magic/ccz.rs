//! CCZ sites: CCZ as the sum of eight diagonal Clifford gates.
//!
//! CCZ = (1/6) Σ_{b ∈ {0,1}³} D_b, D_b the diagonal of ∏ g_i^{b_i} on |+++⟩ and
//! g_i = X_i·CZ_jk the stabilisers of CCZ|+++⟩ without their sign. (8/6)² = 16/9
//! is the extent. Quantum 3, 181 (2019).

use super::site::CczSite;

/// A diagonal Clifford gate on three qubits: products of Z, CZ and a sign.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub struct CczComponent {
    /// Qubits with a Z: bit i for qubit i.
    pub z: u8,
    /// Pairs with a CZ: bits 0, 1, 2 for the pairs (0,1), (1,2), (0,2).
    pub cz: u8,
    /// Whether all of it is negated.
    pub negative: bool,
}

impl CczComponent {
    /// Whether the diagonal entry is −1 where bit i of `x` (0…7) is the value
    /// of qubit i.
    pub fn is_negative_at(self, x: u8) -> bool {
        // Bit p of `pairs`: both qubits of pair p are 1.
        let pairs = (x & (x >> 1) & 0b011) | ((x & 1) << 2 & x);
        let ones = (self.z & x).count_ones() + (self.cz & pairs).count_ones();
        (ones % 2 == 1) != self.negative
    }
}

impl CczSite {
    /// Extent, the square of Σ|weight| = 8/6.
    pub const EXTENT: f64 = 16.0 / 9.0;

    /// Weight of every component.
    pub const WEIGHT: f64 = 1.0 / 6.0;

    /// Number of components.
    pub const COMPONENTS: u8 = 8;

    /// D_b. Bit i of `b` (0…7, higher bits do not count) is the power of g_i.
    pub fn component(b: u8) -> CczComponent {
        let b = b & 7;
        // g_i puts a CZ on the pair without i. Moving it past the X of g_j turns
        // that X into a Z on the third qubit, and three of them leave a sign.
        let [b0, b1, b2] = [b & 1, b >> 1 & 1, b >> 2 & 1];
        CczComponent {
            z: match b.count_ones() {
                0 | 1 => 0,
                2 => !b & 7,
                _ => 7,
            },
            cz: b2 | b0 << 1 | b1 << 2,
            negative: b == 7,
        }
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    fn diagonal(component: CczComponent) -> [f64; 8] {
        let mut diagonal = [0.0; 8];
        for (x, entry) in (0u8..).zip(&mut diagonal) {
            *entry = if component.is_negative_at(x) {
                -1.0
            } else {
                1.0
            };
        }
        diagonal
    }

    /// CCZ = diag(1, …, 1, −1), the definition.
    const CCZ: [f64; 8] = [1.0, 1.0, 1.0, 1.0, 1.0, 1.0, 1.0, -1.0];

    #[test]
    fn eight_diagonals_add_up_to_ccz() {
        let mut sum = [0.0; 8];
        for b in 0..CczSite::COMPONENTS {
            for (total, entry) in sum.iter_mut().zip(diagonal(CczSite::component(b))) {
                *total += CczSite::WEIGHT * entry;
            }
        }
        for (total, expected) in sum.iter().zip(CCZ) {
            assert!((total - expected).abs() < 1e-14);
        }
    }

    /// The eight forms found by linear programming over the 64 sign patterns of
    /// quadratic forms, each overlapping CCZ by 3/4; Quantum 3, 181 (2019) for
    /// the extent, from memory.
    #[test]
    fn the_forms_are_the_published_ones() {
        // [Z on qubits, CZ on pairs (0,1) (1,2) (0,2), sign]
        let forms = [
            (0b000, 0b000, false),
            (0b000, 0b001, false),
            (0b000, 0b010, false),
            (0b000, 0b100, false),
            (0b001, 0b101, false),
            (0b010, 0b011, false),
            (0b100, 0b110, false),
            (0b111, 0b111, true),
        ];
        for (z, cz, negative) in forms {
            let form = CczComponent { z, cz, negative };
            let found = (0..8).filter(|&b| CczSite::component(b) == form).count();
            assert_eq!(found, 1, "{form:?}");
        }
        for b in 0..8 {
            let product = diagonal(CczSite::component(b)).into_iter().zip(CCZ);
            let overlap = product.map(|(a, c)| a * c).sum::<f64>() / 8.0;
            assert!((overlap - 0.75).abs() < 1e-15);
        }
    }

    /// D_b is the diagonal of ∏ (X_i CZ_jk)^{b_i} on |+++⟩: applied literally.
    #[test]
    fn components_are_products_of_the_stabilisers() {
        for b in 0u8..8 {
            let mut state = [1.0; 8];
            for i in 0..3 {
                if b >> i & 1 == 1 {
                    let (j, k) = ((i + 1) % 3, (i + 2) % 3);
                    let mut next = [0.0; 8];
                    for (x, amplitude) in state.into_iter().enumerate() {
                        let both = x >> j & x >> k & 1 == 1;
                        next[x ^ 1 << i] = if both { -amplitude } else { amplitude };
                    }
                    state = next;
                }
            }
            assert_eq!(state, diagonal(CczSite::component(b)), "b = {b}");
        }
    }

    #[test]
    fn extent_is_the_square_of_the_summed_weights() {
        let sum = CczSite::WEIGHT * f64::from(CczSite::COMPONENTS);
        assert!((sum * sum - CczSite::EXTENT).abs() < 1e-15);
        // 16/9: Quantum 3, 181 (2019), from memory.
        assert!((CczSite::EXTENT - 1.777777777778).abs() < 1e-12);
    }
}
