//! Fresh qubits: the beginning of a qubit's life as one prepared state.
//!
//! A qubit at the start, or after an unconditional reset, is |0⟩ and in a
//! product with everything else. As long as it sees unconditional one-qubit
//! gates and channels only, its exact state is a Bloch vector. If the stretch
//! holds a rotation or amplitude damping, it is replaced by its result: an
//! eigenstate of a Pauli (flipped with some probability) where the vector lies
//! on an axis, else a prepared site, of an extent never above the product of
//! those of the rotations it replaces (each ensemble of gates gives an
//! ensemble of states). Stretches of Clifford gates and Pauli noise stay: they
//! cost nothing.

use crate::circuit::{Clifford, Pauli, PauliProduct};
use crate::noise::{PauliChannel, PauliChoices};

use super::timeline::{Direction, NONE, Prepared, Timeline, Work};

/// A component this small is rounding.
const TOLERANCE: f64 = 1e-12;

/// Replaces the stretches of all fresh qubits. Without `absorb` a stretch ends
/// at its first channel.
pub(super) fn collect(timeline: &mut Timeline, absorb: bool) {
    for qubit in 0..timeline.first.len() as u32 {
        let mut start = timeline.first[qubit as usize];
        loop {
            let (stretch, end) = stretch(timeline, qubit, start, absorb);
            replace(timeline, qubit, &stretch);
            match after_next_reset(timeline, qubit, end) {
                Some(next) => start = next,
                None => break,
            }
        }
    }
}

/// The nodes of a stretch that begins at `start`, and the node that ends it.
fn stretch(timeline: &Timeline, qubit: u32, start: u32, absorb: bool) -> (Vec<u32>, u32) {
    let mut nodes = Vec::new();
    let mut next = start;
    while next != NONE {
        let node = timeline.node(next);
        let alone = node.wires.len() == 1 && node.condition.is_none();
        let belongs = match &node.work {
            Work::Clifford(_) | Work::Turns(..) | Work::Rotation { .. } => true,
            Work::Pauli(channel) => absorb && matches!(channel.choices, PauliChoices::Listed(_)),
            Work::Damping { .. } => absorb,
            _ => false,
        };
        if !alone || !belongs {
            break;
        }
        nodes.push(next);
        next = timeline.step(next, qubit, Direction::Forward);
    }
    (nodes, next)
}

/// What follows the next unconditional reset at or after `node`.
fn after_next_reset(timeline: &Timeline, qubit: u32, mut node: u32) -> Option<u32> {
    while node != NONE {
        let here = timeline.node(node);
        let next = timeline.step(node, qubit, Direction::Forward);
        if matches!(here.work, Work::Reset(_)) && here.condition.is_none() {
            return Some(next);
        }
        node = next;
    }
    None
}

fn replace(timeline: &mut Timeline, qubit: u32, stretch: &[u32]) {
    let is_magic = |work: &Work| matches!(work, Work::Rotation { .. } | Work::Damping { .. });
    let magic = stretch
        .iter()
        .find(|&&node| is_magic(&timeline.node(node).work));
    let (Some(&magic), Some((&last, others))) = (magic, stretch.split_last()) else {
        return;
    };
    let (mut bloch, mut ideal) = ([0.0, 0.0, 1.0], [0.0, 0.0, 1.0]);
    for &node in stretch {
        let work = &timeline.node(node).work;
        bloch = evolved(bloch, work);
        if !matches!(work, Work::Pauli(_) | Work::Damping { .. }) {
            ideal = evolved(ideal, work);
        }
    }
    let operation = timeline.node(magic).operation;
    for &node in others {
        timeline.remove(node);
    }
    timeline.nodes[last as usize].work = match on_axis(bloch) {
        Some((axis, component)) => Work::Eigenstate {
            qubit,
            axis,
            negative: component < 0.0,
            flip: flip_probability(component),
        },
        None => Work::Prepared(Prepared {
            qubit,
            bloch,
            ideal,
            operation,
        }),
    };
}

/// The axis of a vector that has one, with the component along it; a zero
/// vector counts as lying on z.
fn on_axis(bloch: [f64; 3]) -> Option<(usize, f64)> {
    let mut large = (0..3).filter(|&axis| bloch[axis].abs() >= TOLERANCE);
    match (large.next(), large.next()) {
        (None, _) => Some((2, 0.0)),
        (Some(axis), None) => Some((axis, bloch[axis])),
        _ => None,
    }
}

/// How often an eigenstate has to be flipped to have this component.
fn flip_probability(component: f64) -> f64 {
    let p = (1.0 - component.abs()) / 2.0;
    if p < TOLERANCE { 0.0 } else { p }
}

/// The Bloch vector after a one-qubit gate or channel. Gates turn it:
/// exp(−iθP/2) by θ about P. Amplitude damping takes (x, y, z) to
/// (√(1−γ)x, √(1−γ)y, γ + (1−γ)z). A Pauli word flips the sign of the
/// components it anticommutes with.
fn evolved(bloch: [f64; 3], work: &Work) -> [f64; 3] {
    let [x, y, z] = bloch;
    match work {
        Work::Clifford(clifford) => match clifford {
            Clifford::X(_) => [x, -y, -z],
            Clifford::Y(_) => [-x, y, -z],
            Clifford::Z(_) => [-x, -y, z],
            Clifford::H(_) => [z, -y, x],
            Clifford::S(_) => [-y, x, z],
            Clifford::Sdg(_) => [y, -x, z],
            Clifford::QuarterTurn(axis) => quarter_turns(bloch, axis, 1),
            Clifford::Cx(..) | Clifford::Cz(..) | Clifford::Swap(..) => bloch,
        },
        Work::Turns(axis, quarters) => quarter_turns(bloch, axis, *quarters),
        Work::Rotation {
            axis,
            quarters,
            angle,
            ..
        } => {
            let (sin, cos) = angle.sin_cos();
            turned(quarter_turns(bloch, axis, *quarters), axis, sin, cos)
        }
        Work::Damping { gamma, .. } => {
            let shrink = (1.0 - gamma).sqrt();
            [shrink * x, shrink * y, gamma + (1.0 - gamma) * z]
        }
        Work::Pauli(channel) => flipped(bloch, channel),
        _ => bloch,
    }
}

fn quarter_turns(bloch: [f64; 3], axis: &PauliProduct, quarters: u8) -> [f64; 3] {
    (0..quarters).fold(bloch, |bloch, _| turned(bloch, axis, 1.0, 0.0))
}

fn turned([x, y, z]: [f64; 3], axis: &PauliProduct, sin: f64, cos: f64) -> [f64; 3] {
    match axis.first() {
        Some((_, Pauli::X)) => [x, cos * y - sin * z, cos * z + sin * y],
        Some((_, Pauli::Y)) => [cos * x + sin * z, y, cos * z - sin * x],
        Some((_, Pauli::Z)) => [cos * x - sin * y, cos * y + sin * x, z],
        _ => [x, y, z],
    }
}

fn flipped([x, y, z]: [f64; 3], channel: &PauliChannel) -> [f64; 3] {
    let PauliChoices::Listed(words) = &channel.choices else {
        return [x, y, z];
    };
    let (mut flips_x, mut flips_y, mut flips_z) = (0.0, 0.0, 0.0);
    for (word, p) in words {
        flips_x += if word.z & 1 == 1 { *p } else { 0.0 };
        flips_z += if word.x & 1 == 1 { *p } else { 0.0 };
        flips_y += if (word.x ^ word.z) & 1 == 1 { *p } else { 0.0 };
    }
    [
        x * (1.0 - 2.0 * flips_x),
        y * (1.0 - 2.0 * flips_y),
        z * (1.0 - 2.0 * flips_z),
    ]
}
