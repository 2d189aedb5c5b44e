//! Splitting a pure one-qubit state into stabiliser states with (Σ|c|)² equal to
//! its extent.
//!
//! The splitting is solved in the octant the state lies in, with the stabiliser
//! states nearest to it, so it holds in every octant, reflected or not.
//!
//! - *edge*: two states span the space; their weights are unique.
//! - *face*: with f the state along the octant's diagonal, all three overlaps
//!   |⟨f|φ_j⟩| equal √F, F = (1 + 1/√3)/2. Weights c_j = a_j·conj(phase⟨f|φ_j⟩)
//!   with a_j ≥ 0 add up to ⟨f|ψ⟩ = √F·Σa_j, so (Σa)² = |⟨f|ψ⟩|²/F, which the
//!   witness f/√F shows to be the extent (Quantum 3, 181 (2019)). Across f the
//!   three point 120° apart, so the a_j follow without solving a system.
//!
//! Knows nothing of ensembles.

use num_complex::Complex64;

use super::bloch::{Bloch, Octant, amplitudes, overlap};
use super::extent::INVERSE_SQRT_3;
use super::site::{PreparedMember, Stabiliser};

/// Splits a unit vector of the edge region into the stabiliser states on the two
/// larger axes of `octant`.
pub(super) fn edge(probability: f64, bloch: Bloch, octant: &Octant) -> PreparedMember {
    let state = amplitudes(bloch);
    let (first, second) = (octant.stabiliser(0), octant.stabiliser(1));
    let (a, b) = (first.amplitudes(), second.amplitudes());
    let determinant = a[0] * b[1] - a[1] * b[0];
    let weights = [
        (state[0] * b[1] - state[1] * b[0]) / determinant,
        (a[0] * state[1] - a[1] * state[0]) / determinant,
    ];
    member(probability, state, [first, second].into_iter().zip(weights))
}

/// Splits a unit vector of the face region into the three stabiliser states on
/// the axes of `octant`.
pub(super) fn face(probability: f64, bloch: Bloch, octant: &Octant) -> PreparedMember {
    let state = amplitudes(bloch);
    let centre = amplitudes(octant.restored([INVERSE_SQRT_3; 3]));
    let across = [-centre[1].conj(), centre[0].conj()];
    let overlap_squared = 0.5 * (1.0 + INVERSE_SQRT_3);

    let along_centre = overlap(centre, state);
    let phase = along_centre / along_centre.norm();
    // Components of the state along and across f, with the first one real.
    let mean = along_centre.norm() / overlap_squared.sqrt() / 3.0;
    let rest = overlap(across, state) * phase.conj();

    let states = [0, 1, 2].map(|rank| octant.stabiliser(rank));
    let weights = states.map(|stabiliser| {
        let component = stabiliser.amplitudes();
        let along_component = overlap(centre, component);
        let turn = (along_component / along_component.norm()).conj();
        let across_component = overlap(across, component) * turn;
        let tilt = (across_component.conj() * rest).re / (1.0 - overlap_squared);
        let modulus = mean + 2.0 / 3.0 * tilt;
        // Exactly 0 on the border to the edge region; rounding may fall below.
        debug_assert!(modulus > -1e-9, "weight {modulus} of {bloch:?}");
        turn * phase * modulus.max(0.0)
    });
    member(probability, state, states.into_iter().zip(weights))
}

/// Leaves out components of weight 0.
fn member(
    probability: f64,
    state: [Complex64; 2],
    components: impl Iterator<Item = (Stabiliser, Complex64)>,
) -> PreparedMember {
    PreparedMember {
        probability,
        state,
        components: components
            .filter(|(_, weight)| weight.norm_sqr() > 0.0)
            .collect(),
    }
}
