//! A walk from a node along the qubits of an axis, in order of time.

use smallvec::SmallVec;

use crate::circuit::PauliProduct;

use super::timeline::{Direction, NONE, Timeline};

/// Where a walk stands: for every letter of its axis the last node seen there.
pub(super) struct Walk {
    axis: PauliProduct,
    seen: SmallVec<[u32; 2]>,
    direction: Direction,
}

impl Walk {
    /// A walk that starts next to `node`, which acts on all qubits of `axis`.
    pub(super) fn new(node: u32, axis: PauliProduct, direction: Direction) -> Walk {
        Walk {
            seen: SmallVec::from_elem(node, axis.len()),
            axis,
            direction,
        }
    }

    /// The axis as it is where the walk stands.
    pub(super) fn axis(&self) -> &PauliProduct {
        &self.axis
    }

    /// The next node that acts on a qubit of the axis.
    pub(super) fn next(&mut self, timeline: &Timeline) -> Option<u32> {
        let ahead: SmallVec<[u32; 2]> = self
            .axis
            .iter()
            .zip(&self.seen)
            .map(|(&(qubit, _), &seen)| timeline.step(seen, qubit, self.direction))
            .collect();
        let candidates = ahead.iter().copied().filter(|&node| node != NONE);
        let next = match self.direction {
            Direction::Forward => candidates.min(),
            Direction::Backward => candidates.max(),
        }?;
        for (seen, ahead) in self.seen.iter_mut().zip(ahead) {
            if ahead == next {
                *seen = next;
            }
        }
        Some(next)
    }

    /// Goes on with another axis past `node`, the node that changed it.
    pub(super) fn turn(&mut self, axis: PauliProduct, node: u32) {
        if axis == self.axis {
            return;
        }
        self.seen = axis
            .iter()
            .map(|&(qubit, _)| {
                let place = self.axis.iter().position(|&(q, _)| q == qubit);
                place.map_or(node, |place| self.seen[place])
            })
            .collect();
        self.axis = axis;
    }
}
