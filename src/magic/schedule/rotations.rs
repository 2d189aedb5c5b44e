//! Rotations about one axis add up; quarter turns are taken off every angle.
//!
//! exp(−iaA/2)·exp(−ibA/2) = exp(−i(a+b)A/2), so a rotation that reaches an
//! earlier one about the same axis, past instructions that commute with it,
//! adds its angle there. exp(−iπA/4) is Clifford, exp(−iπA/2) = −iA: an angle
//! is a number of quarter turns and a rest in [0, π/2).

use std::f64::consts::{FRAC_PI_2, TAU};

use super::axis::rotation_passes;
use super::timeline::{Direction, Timeline, Work};
use super::walk::Walk;

/// An angle this near to a multiple of π/2 is one; a large angle may miss it by
/// as much as it can have been rounded.
const TOLERANCE: f64 = 1e-12;

/// How many instructions a rotation looks past for the next one.
const REACH: usize = 64;

/// Adds every rotation to the one before it about the same axis, under the
/// same condition, that it can reach.
pub(super) fn add_up(timeline: &mut Timeline) {
    for index in 0..timeline.nodes.len() as u32 {
        let node = timeline.node(index);
        let Work::Rotation { axis, angle, .. } = &node.work else {
            continue;
        };
        let (axis, mut sum, condition) = (axis.clone(), *angle, node.condition);
        let mut walk = Walk::new(index, axis.clone(), Direction::Forward);
        let mut passed = 0;
        while passed < REACH
            && let Some(next) = walk.next(timeline)
        {
            match &timeline.node(next).work {
                Work::Rotation {
                    axis: other, angle, ..
                } if *other == axis && timeline.node(next).condition == condition => {
                    sum = sum % TAU + angle % TAU;
                    timeline.remove(next);
                    passed = 0;
                }
                _ if rotation_passes(&axis, timeline.node(next)) => passed += 1,
                _ => break,
            }
        }
        if let Work::Rotation { angle, .. } = &mut timeline.nodes[index as usize].work {
            *angle = sum;
        }
    }
}

/// Takes the quarter turns off every rotation. One that has no rest becomes
/// quarter turns, or nothing.
pub(super) fn fold(timeline: &mut Timeline) {
    for index in 0..timeline.nodes.len() as u32 {
        let Work::Rotation { axis, angle, .. } = &timeline.node(index).work else {
            continue;
        };
        let (quarters, rest) = quarters_and_rest(*angle);
        if axis.is_empty() || (quarters == 0 && rest == 0.0) {
            timeline.remove(index);
            continue;
        }
        let axis = axis.clone();
        timeline.nodes[index as usize].work = if rest == 0.0 {
            Work::Turns(axis, quarters)
        } else {
            Work::Rotation {
                axis,
                quarters,
                angle: rest,
                dephasing: 0.0,
            }
        };
    }
}

/// The angle as quarter turns modulo a whole turn (0 to 3) and a rest in
/// [0, π/2), 0 where it is within the tolerance of a multiple.
pub(in crate::magic) fn quarters_and_rest(angle: f64) -> (u8, f64) {
    // The nearest multiple first, so that a rest at rounding level is seen as such.
    let turns = angle % TAU / FRAC_PI_2;
    let nearest = turns.round();
    let rest = angle % TAU - nearest * FRAC_PI_2;
    let tolerance = (4.0 * f64::EPSILON * angle.abs()).clamp(TOLERANCE, 1e-9);
    let (quarters, rest) = if rest.abs() < tolerance {
        (nearest, 0.0)
    } else if rest < 0.0 {
        (nearest - 1.0, rest + FRAC_PI_2)
    } else {
        (nearest, rest)
    };
    (quarters.rem_euclid(4.0) as u8, rest)
}

#[cfg(test)]
mod tests {
    use super::*;
    use std::f64::consts::{FRAC_PI_4, PI};

    #[test]
    fn angles_fold_to_the_first_quadrant() {
        for (angle, quarters, rest) in [
            (FRAC_PI_4, 0, FRAC_PI_4),
            (-FRAC_PI_4, 3, FRAC_PI_4),
            (PI, 2, 0.0),
            (-PI, 2, 0.0),
            (TAU, 0, 0.0),
            (7.0 * FRAC_PI_2 - 1e-13, 3, 0.0),
            (1.6, 1, 1.6 - FRAC_PI_2),
            (0.0, 0, 0.0),
            (1e5 * PI, 0, 0.0),
            (1e5 * PI + 0.3, 0, 0.3),
        ] {
            let (found_quarters, found_rest) = quarters_and_rest(angle);
            assert_eq!(found_quarters, quarters, "{angle}");
            assert!(
                (found_rest - rest).abs() < 1e-15 + 1e-15 * angle.abs(),
                "{angle}: {found_rest}"
            );
        }
    }

    #[test]
    fn any_angle_is_its_quarters_and_rest() {
        for step in -1000..1000 {
            let angle = f64::from(step) * 0.137;
            let (quarters, rest) = quarters_and_rest(angle);
            assert!((0.0..FRAC_PI_2).contains(&rest));
            let back = f64::from(quarters) * FRAC_PI_2 + rest;
            assert!((back - angle).sin().abs() < 1e-11 && (back - angle).cos() > 0.0);
        }
    }
}
