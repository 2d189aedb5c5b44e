//! Stabiliser extent of a one-qubit mixed state and of a rotation, in closed
//! form.
//!
//! The extent Ξ(ρ) is the least mean of (Σ|c|)² over all ensembles of ρ whose
//! members are split into stabiliser states with weights c; equally the least t
//! with ρ ≤ t·σ, σ a mixture of stabiliser states. PRX Quantum 2, 010345 (2021).
//! Its dual is Ξ = max over unit vectors n of (1 + n·r)/(1 + max|n_i|): the
//! witness is the state along n, scaled so that no stabiliser state exceeds 1.
//! With r1 ≥ r2 ≥ r3 ≥ 0 the best n is
//! - (1,1,1)/√3 on a *face*, r3 ≥ m0 = (r1+r2+r3 − 1)/(3+√3);
//! - (cosγ/√2, cosγ/√2, sinγ) on an *edge*, r3 < m0.
//!
//! Knows nothing of how a state came about.

use std::f64::consts::{FRAC_1_SQRT_2, FRAC_PI_8};

use super::bloch::{Bloch, Octant};

/// A vector counts as a stabiliser mixture up to this excess of Σ|r_i| over 1,
/// so that rounding does not turn one into a site of extent 1 + 1e-16.
pub(super) const ROUNDING: f64 = 1e-14;

/// 3 + √3.
const FACE_SLOPE: f64 = 4.732_050_807_568_877;
/// 1/√3.
pub(super) const INVERSE_SQRT_3: f64 = 0.577_350_269_189_625_8;

/// Which splitting is the best one, for sorted absolute values.
#[derive(Debug, Clone, Copy, PartialEq)]
pub(super) enum Region {
    /// r1 + r2 + r3 ≤ 1: a mixture of stabiliser states.
    Mixture,
    /// Two stabiliser states, those of the two larger components.
    Edge,
    /// Three stabiliser states, one per axis.
    Face {
        /// m0: no member may have a component below this.
        least: f64,
    },
}

impl Region {
    /// The region of a sorted vector, r1 ≥ r2 ≥ r3 ≥ 0.
    pub(super) fn of(sorted: Bloch) -> Region {
        let sum = sorted[0] + sorted[1] + sorted[2];
        let least = (sum - 1.0) / FACE_SLOPE;
        if sum <= 1.0 + ROUNDING {
            Region::Mixture
        } else if sorted[2] < least {
            Region::Edge
        } else {
            Region::Face { least }
        }
    }
}

/// Extent of the one-qubit state with this Bloch vector, length at most 1; from
/// 1 (a stabiliser mixture) to 3 − √3.
pub fn of_state(bloch: Bloch) -> f64 {
    let sorted = Octant::of(bloch).sorted(bloch);
    let [r1, r2, r3] = sorted;
    match Region::of(sorted) {
        Region::Mixture => 1.0,
        Region::Edge => {
            let excess = (r1 + r2 - 1.0) * FRAC_1_SQRT_2;
            let gamma = r3.atan2(excess) + (r3 * FRAC_1_SQRT_2 / excess.hypot(r3)).asin();
            let (sin, cos) = gamma.sin_cos();
            (1.0 + (r1 + r2) * cos * FRAC_1_SQRT_2 + r3 * sin) / (1.0 + cos * FRAC_1_SQRT_2)
        }
        Region::Face { .. } => (1.0 + (r1 + r2 + r3) * INVERSE_SQRT_3) / (1.0 + INVERSE_SQRT_3),
    }
}

/// Extent of a rotation by `angle` in [0, π/2]: (cos(θ/2) + tan(π/8) sin(θ/2))².
/// Quantum 3, 181 (2019).
pub fn of_rotation(angle: f64) -> f64 {
    let (sin, cos) = (0.5 * angle).sin_cos();
    (cos + FRAC_PI_8.tan() * sin).powi(2)
}
