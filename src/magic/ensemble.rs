//! Equal-extent ensembles: a mixed one-qubit state as a mixture of pure states
//! that all have the extent of the mixture.
//!
//! Equal extents make the mixing weight of the sampling law the same for every
//! shot. The extent is linear on the plane x+y+z = S in the face region, and on
//! the chord direction (1,−1,0) in the edge region (there it depends on r1+r2
//! and r3 only), so moving along these to the unit sphere changes nothing. PRX
//! Quantum 2, 010345 (2021) for the theory.
//!
//! Knows nothing of splittings.

use std::f64::consts::FRAC_1_SQRT_2;

use smallvec::{SmallVec, smallvec};

use super::bloch::{Bloch, along, dot, unit};
use super::extent::ROUNDING;

/// A chance and a unit Bloch vector (in the sorted octant).
pub(super) type Weighted = (f64, Bloch);

/// At most three members.
pub(super) type Ensemble = SmallVec<[Weighted; 3]>;

/// Ensemble of a sorted vector of the edge region: the ends of the chord through
/// it along (1,−1,0)/√2.
pub(super) fn edge(sorted: Bloch) -> Ensemble {
    if is_pure(sorted) {
        return smallvec![(1.0, unit(sorted))];
    }
    chord(sorted, [FRAC_1_SQRT_2, -FRAC_1_SQRT_2, 0.0])
}

/// Ensemble of a sorted vector of the face region: points of the circle in which
/// the plane x+y+z = S cuts the sphere, no coordinate below `least`.
pub(super) fn face(sorted: Bloch, least: f64) -> Ensemble {
    if is_pure(sorted) {
        return smallvec![(1.0, unit(sorted))];
    }
    let sum = sorted[0] + sorted[1] + sorted[2];
    let third = sum / 3.0;
    // Circle of radius ρ about (S,S,S)/3; its point towards axis 1.
    let radius = (1.0 - sum * third).max(0.0).sqrt();
    let arm = radius / 6f64.sqrt();
    let towards_axis = [third + 2.0 * arm, third - arm, third - arm];

    let ray = along(sorted, -1.0, towards_axis);
    let length_squared = dot(ray, ray);
    if length_squared < ROUNDING * ROUNDING {
        return smallvec![(1.0, unit(sorted))];
    }
    // |v + τ·ray − centre| = ρ again at this τ, at least 1 as the state is inside.
    let from_centre = [2.0 * arm, -arm, -arm];
    let circle = (-2.0 * dot(from_centre, ray) / length_squared).max(1.0);
    // The first line {coordinate = m0} the ray crosses on its way there.
    let crossing = (0..3)
        .filter(|&axis| towards_axis[axis] + circle * ray[axis] < least - ROUNDING)
        .map(|axis| (axis, (least - towards_axis[axis]) / ray[axis]))
        .min_by(|a, b| a.1.total_cmp(&b.1));

    match crossing {
        None => {
            let share = 1.0 / circle;
            let far = along(towards_axis, circle, ray);
            smallvec![(1.0 - share, unit(towards_axis)), (share, unit(far))]
        }
        Some((axis, line)) => {
            let line = line.max(1.0);
            let share = 1.0 / line;
            let mut direction = [FRAC_1_SQRT_2; 3];
            direction[axis] = 0.0;
            direction[(axis + 1) % 3] = -FRAC_1_SQRT_2;
            let mut members: Ensemble = smallvec![(1.0 - share, unit(towards_axis))];
            let ends = chord(along(towards_axis, line, ray), direction);
            members.extend(ends.into_iter().map(|(p, end)| (share * p, end)));
            members
        }
    }
}

/// The two ends of the chord of the unit sphere through `point` along the unit
/// vector `direction`, mixed so that they average to `point`.
fn chord(point: Bloch, direction: Bloch) -> Ensemble {
    // |point + t·direction|² = 1: t = −b ± h.
    let b = dot(point, direction);
    let half = (b * b + (1.0 - dot(point, point)).max(0.0)).sqrt();
    if half < ROUNDING {
        return smallvec![(1.0, unit(point))];
    }
    let share = (0.5 * (1.0 + b / half)).clamp(0.0, 1.0);
    smallvec![
        (share, unit(along(point, half - b, direction))),
        (1.0 - share, unit(along(point, -half - b, direction))),
    ]
}

fn is_pure(bloch: Bloch) -> bool {
    1.0 - dot(bloch, bloch) <= 2.0 * ROUNDING
}
