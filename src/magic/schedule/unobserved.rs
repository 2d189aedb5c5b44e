//! What happens to one qubit alone just before it is reset.
//!
//! A reset forgets the state of its qubit: Reset∘E = Reset for every channel E
//! on that qubit, executed or not. So such gates and channels go.

use super::timeline::{Direction, NONE, Timeline, Work};

/// Takes out one-qubit gates and channels right before unconditional resets.
pub(super) fn remove(timeline: &mut Timeline) {
    for index in 0..timeline.nodes.len() as u32 {
        let node = timeline.node(index);
        let (Work::Reset(qubit), None) = (&node.work, node.condition) else {
            continue;
        };
        let qubit = *qubit;
        loop {
            let before = timeline.step(index, qubit, Direction::Backward);
            if before == NONE || !is_alone(timeline, before) {
                break;
            }
            timeline.remove(before);
        }
    }
}

/// Whether a node is a gate or channel on one qubit only.
fn is_alone(timeline: &Timeline, index: u32) -> bool {
    let node = timeline.node(index);
    node.wires.len() == 1
        && matches!(
            node.work,
            Work::Clifford(_)
                | Work::Turns(..)
                | Work::Rotation { .. }
                | Work::Pauli(_)
                | Work::Damping { .. }
        )
}
