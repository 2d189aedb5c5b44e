//! Fewer sites: a schedule rewritten without changing the law of what it
//! records.
//!
//! Three rewrites, repeated while they find something:
//!
//! 1. [`light_cone`]: what no recorded bit depends on goes.
//! 2. [`pass`]: rotations about one axis, carried through Clifford gates of any
//!    width and over any distance, merge, also into a prepared state; up to
//!    stabilisers of the state whose sign is certain. A sum that is a multiple of
//!    π/2 is Clifford.
//! 3. [`pass`]: a rotation about a certain stabiliser is a phase, and one that
//!    commutes with all that is still to come is seen by nobody. Both go.
//!
//! Each is proved where it is done. Extents never grow: a merged rotation has
//! one of its members' sums for every pair of members, so its extent is at most
//! the product of the two (PRX Quantum 2, 010345 (2021)).
//!
//! At most [`rows::MAX_ROWS`] axes are carried at a time; when that is not
//! enough the oldest quarter of them is given up, which costs merges and nothing
//! else. Time is proportional to the number of instructions, times a row of the
//! frame.
//!
//! This is no merging of noise, and is done whether or not noise is absorbed;
//! dephasings already in sites add up with them.

mod known;
mod light_cone;
mod merged;
mod pass;
mod rows;
#[cfg(test)]
mod tests;

use crate::magic::Schedule;

/// Walks of one schedule at most.
const ROUNDS: usize = 8;

/// A schedule after reduction.
#[derive(Debug, Clone)]
pub struct Reduced {
    /// The schedule with the same law of the recorded bits.
    pub schedule: Schedule,
    /// How many sites went.
    pub counts: SiteCounts,
}

/// How many sites went, and why.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Default)]
pub struct SiteCounts {
    /// Sites that merged into an earlier one, or became Clifford by that.
    pub merged: usize,
    /// Rotations about an axis whose value is the same in every shot.
    pub deterministic: usize,
    /// Sites no recorded bit depends on.
    pub unobservable: usize,
}

/// Reduces a schedule on so many qubits. `recorded[b]` says whether bit b is
/// recorded; bits past its end are not.
pub fn reduce(mut schedule: Schedule, qubits: usize, recorded: &[bool]) -> Reduced {
    let mut counts = SiteCounts::default();
    for _ in 0..ROUNDS {
        let gone = light_cone::trim(&mut schedule, qubits, recorded);
        counts.unobservable += gone.iter().filter(|&&gone| gone).count();
        let before = gone.iter().filter(|&&gone| !gone).count();
        let mut found = pass::walk(&schedule, qubits);
        for (fate, gone) in found.fates.iter_mut().zip(gone) {
            if gone {
                *fate = merged::Fate::Gone;
            }
        }
        let (rewritten, there) = merged::rewrite(schedule, &found.fates);
        schedule = rewritten;
        counts.deterministic += found.phases;
        counts.unobservable += found.unobservable;
        let left = there.iter().filter(|&&there| there).count();
        counts.merged += before - left - found.phases - found.unobservable;
        if !found.changed {
            break;
        }
    }
    Reduced { schedule, counts }
}
